namespace PanelChoice.Certificates;

/// <summary>Prints how true distances stand to certificates, a row for each kind of replicate.</summary>
/// <param name="tolerance">The tolerance of the study: distances above it are counted.</param>
internal sealed class DistanceTable(double tolerance)
{
    /// <summary>What rounding leaves open about the distance that is measured, in standard errors.</summary>
    private const double Rounding = 2e-11;

    /// <summary>Whether a replicate was farther away than its certificate says, or ended at no maximum.</summary>
    public bool Exceeded { get; private set; }

    public static void Head()
    {
        Console.WriteLine($"{"",-32}{"repli-",9}   {"true distance / certificate",-44}{"beyond",8}{"largest",11}{"beyond",8}");
        Console.WriteLine($"{"",-32}{"cates",9}{"median",11}{"95 %",9}{"99 %",9}{"99.9 %",9}{"largest",9}{"it",8}{"distance",11}{"tol.",8}");
    }

    public void Row(string what, IEnumerable<CertifiedReplicate> replicates)
    {
        var measured = replicates.ToList();
        var ratios = measured.Select(r => double.IsNaN(r.Distance) ? double.PositiveInfinity : Math.Max(0, r.Distance - Rounding) / r.Certificate).Order().ToArray();
        if (ratios.Length == 0)
        {
            Console.WriteLine($"{what,-32}{0,9}");
            return;
        }

        double At(double share) => ratios[Math.Min(ratios.Length - 1, (int)(share * ratios.Length))];
        var beyond = ratios.Count(r => r > 1);
        Exceeded |= beyond > 0;
        var far = measured.Count(r => !(r.Distance <= tolerance));
        Console.WriteLine(
            $"{what,-32}{ratios.Length,9}{At(0.5),11:F4}{At(0.95),9:F4}{At(0.99),9:F3}{At(0.999),9:F3}{ratios[^1],9:F3}{beyond,8}{measured.Max(r => r.Distance),11:E1}{far,8}");
    }
}
