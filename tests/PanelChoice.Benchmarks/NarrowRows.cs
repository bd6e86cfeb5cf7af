namespace PanelChoice.Benchmarks;

/// <summary>The likelihood's rows once more where the machine is forced to 256-bit vectors.</summary>
internal static class NarrowRows
{
    /// <summary>Runs this program with 512-bit vectors switched off and passes its table on.</summary>
    /// <param name="cases">The cases.</param>
    public static void Run(string[] cases)
    {
        Console.WriteLine();
        Console.WriteLine("512-bit vectors switched off (DOTNET_EnableAVX512=0):");
        var child = ChildProcess.Benchmarks(
            new Dictionary<string, string> { ["DOTNET_EnableAVX512"] = "0" }, "--case", string.Join(',', cases), "--rows", "elementary,gradient,hessian");
        Agreement.Holds(child.Code == 0 && child.Output.StartsWith("Kernel vector256", StringComparison.Ordinal), $"the narrow run ended with {child.Code}, or not with vectors of 256 bits");
        Console.Write(child.Output);
    }
}
