using Mono.Cecil;
using Xunit;

namespace PanelChoice.Tests.Architecture;

/// <summary>Data flows one way: a folder of the library may use only folders to its left.</summary>
public class LayeringTests
{
    private static readonly string[] Order =
    [
        "Numerics", "Optimisation", "Study", "Data", "Panels", "Covariates", "Design", "Likelihood", "Estimation", "Simulation",
        "Inference", "Diagnostics", "Remedies", "Findings", "Consequences", "Results",
    ];

    [Fact]
    public void No_folder_uses_a_folder_to_its_right()
    {
        using var assembly = AssemblyDefinition.ReadAssembly(typeof(PanelChoice.Study.Problem).Assembly.Location);
        var wrong = new SortedSet<string>(StringComparer.Ordinal);
        foreach (var type in assembly.MainModule.GetTypes())
        {
            if (FolderOf(type) is not { } from) continue;
            foreach (var used in Uses(type))
                if (FolderOf(used) is { } to && Array.IndexOf(Order, to) > Array.IndexOf(Order, from))
                    wrong.Add($"{type.FullName} ({from}) uses {used.FullName} ({to})");
        }

        Assert.Empty(wrong);
    }

    [Fact]
    public void Numerics_and_optimisation_know_nothing_of_choice()
    {
        using var assembly = AssemblyDefinition.ReadAssembly(typeof(PanelChoice.Study.Problem).Assembly.Location);
        var wrong = from type in assembly.MainModule.GetTypes()
                    where FolderOf(type) is "Numerics" or "Optimisation"
                    from used in Uses(type)
                    where FolderOf(used) is { } to && to is not ("Numerics" or "Optimisation")
                    select $"{type.FullName} uses {used.FullName}";
        Assert.Empty(wrong);
    }

    [Fact]
    public void Only_the_run_itself_stands_at_the_root()
    {
        using var assembly = AssemblyDefinition.ReadAssembly(typeof(PanelChoice.Study.Problem).Assembly.Location);
        var roots = assembly.MainModule.GetTypes().Where(t => t.IsPublic && t.Namespace == "PanelChoice").Select(t => t.Name);
        Assert.All(roots, name => Assert.StartsWith("PanelAnalysis", name, StringComparison.Ordinal));
    }

    [Fact]
    public void Every_namespace_is_a_known_folder()
    {
        using var assembly = AssemblyDefinition.ReadAssembly(typeof(PanelChoice.Study.Problem).Assembly.Location);
        var unknown = assembly.MainModule.GetTypes()
            .Where(t => t.Namespace.StartsWith("PanelChoice.", StringComparison.Ordinal) && Array.IndexOf(Order, FolderOf(t)) < 0)
            .Select(t => t.FullName);
        Assert.Empty(unknown);
    }

    [Fact]
    public void The_library_never_writes_to_a_console()
    {
        using var assembly = AssemblyDefinition.ReadAssembly(typeof(PanelChoice.Study.Problem).Assembly.Location);
        var writers = assembly.MainModule.GetTypes().Where(t => Uses(t).Any(u => u.FullName == "System.Console")).Select(t => t.FullName);
        Assert.Empty(writers);
    }

    private static string? FolderOf(TypeReference type)
    {
        var t = type;
        while (t.DeclaringType is not null) t = t.DeclaringType;
        return t.Namespace.StartsWith("PanelChoice.", StringComparison.Ordinal) ? t.Namespace.Split('.')[1] : null;
    }

    private static IEnumerable<TypeReference> Uses(TypeDefinition type)
    {
        var used = new List<TypeReference>();
        if (type.BaseType is not null) used.Add(type.BaseType);
        used.AddRange(type.Interfaces.Select(i => i.InterfaceType));
        used.AddRange(type.Fields.Select(f => f.FieldType));
        foreach (var method in type.Methods)
        {
            used.Add(method.ReturnType);
            used.AddRange(method.Parameters.Select(p => p.ParameterType));
            if (!method.HasBody) continue;
            used.AddRange(method.Body.Variables.Select(v => v.VariableType));
            foreach (var instruction in method.Body.Instructions)
                switch (instruction.Operand)
                {
                    case TypeReference t: used.Add(t); break;
                    case MethodReference m:
                        used.Add(m.DeclaringType);
                        used.Add(m.ReturnType);
                        if (m is GenericInstanceMethod g) used.AddRange(g.GenericArguments);
                        break;
                    case FieldReference f: used.Add(f.DeclaringType); used.Add(f.FieldType); break;
                }
        }

        return used.SelectMany(Unwrap);
    }

    private static IEnumerable<TypeReference> Unwrap(TypeReference type)
    {
        switch (type)
        {
            case GenericInstanceType g: return g.GenericArguments.SelectMany(Unwrap).Append(g.ElementType);
            case TypeSpecification s: return Unwrap(s.ElementType);
            default: return [type];
        }
    }
}
