using System.Collections.Immutable;
using System.Globalization;
using System.Runtime.InteropServices;
using System.Security.Cryptography;
using System.Text;
using PanelChoice.Estimation;
using PanelChoice.Inference;
using PanelChoice.Likelihood;
using PanelChoice.Study;

namespace PanelChoice.Results.Refits;

/// <summary>Everything that the bits of a refit depend on besides its series and number. Refits of equal origin may stand side by side.</summary>
/// <param name="Study">SHA-256 of the study file.</param>
/// <param name="Data">SHA-256 of the data file.</param>
/// <param name="EstimateSeed">Seed of the starting points.</param>
/// <param name="BootstrapSeed">Seed of the bootstrap.</param>
/// <param name="Kernel">Likelihood kernel: bits are promised per kernel.</param>
/// <param name="Version">Version of the program.</param>
/// <param name="Runtime">Runtime and kind of processor, for example ".NET 10.0.1 on X64".</param>
/// <param name="Estimate">SHA-256 over the bits of the estimates from which every refit starts.</param>
/// <param name="Parameters">Number of parameters, free and fixed.</param>
/// <param name="Replicates">Bootstrap replicates of the whole analysis.</param>
/// <param name="Deletions">Refits without one cluster each, of the whole analysis.</param>
public sealed record RefitOrigin(
    string Study, string Data, long EstimateSeed, long BootstrapSeed, string Kernel, string Version, string Runtime, string Estimate,
    int Parameters, int Replicates, int Deletions)
{
    /// <summary>The origin of the refits of a fit.</summary>
    /// <param name="study">The study.</param>
    /// <param name="dataSha256">SHA-256 of its data.</param>
    /// <param name="model">The fit.</param>
    /// <param name="plan">The refits it needs.</param>
    internal static RefitOrigin Of(StudySpecification study, string dataSha256, FittedModel model, RefitPlan plan)
    {
        ArgumentNullException.ThrowIfNull(study);
        ArgumentNullException.ThrowIfNull(model);
        ArgumentNullException.ThrowIfNull(plan);
        return new RefitOrigin(
            study.Sha256, dataSha256, study.Estimate.Seed, study.Inference.BootstrapSeed, model.Likelihood.Kernel, ResultBuilder.Version, RuntimeHere,
            Convert.ToHexStringLower(SHA256.HashData(MemoryMarshal.AsBytes(model.Parameters.AsSpan()))),
            model.Parameters.Length, plan.Replicates, plan.Deletions);
    }

    /// <summary>The same refits made from a study and data here, as far as that is known without a fit.</summary>
    /// <param name="study">The study.</param>
    /// <param name="dataSha256">SHA-256 of its data.</param>
    internal RefitOrigin GivenBy(StudySpecification study, string dataSha256) => this with
    {
        Study = study.Sha256, Data = dataSha256, EstimateSeed = study.Estimate.Seed, BootstrapSeed = study.Inference.BootstrapSeed,
        Kernel = LikelihoodKernel.NameHere, Version = ResultBuilder.Version, Runtime = RuntimeHere,
    };

    private static string RuntimeHere => $"{RuntimeInformation.FrameworkDescription} on {RuntimeInformation.ProcessArchitecture}";

    /// <summary>
    /// One short name for what was given: lower-case hexadecimal SHA-256 over study, data, seeds, kernel, version and runtime. The estimate and the
    /// counts follow from these.
    /// </summary>
    public string Key => Convert.ToHexStringLower(SHA256.HashData(Encoding.UTF8.GetBytes(string.Create(
        CultureInfo.InvariantCulture, $"{Study}\n{Data}\n{EstimateSeed}\n{BootstrapSeed}\n{Kernel}\n{Version}\n{Runtime}\n"))));

    /// <summary>What two origins first differ in, in the order in which it tells most; null when they are equal.</summary>
    /// <param name="there">The other origin.</param>
    internal OriginDifference? Against(RefitOrigin there)
    {
        const string SameMachines = "use machines of one kind for all parts and for the gathering";
        const string Again = "make all parts again in another folder";
        ImmutableArray<OriginDifference> marks =
        [
            new("the study file", Short(there.Study), Short(Study), "name the study file that the parts were made from with --study, or " + Again),
            new("the data file", Short(there.Data), Short(Data), "restore the data file, or " + Again),
            new("the version of the program", there.Version, Version, "use one version for all parts and for the gathering"),
            new("the runtime", there.Runtime, Runtime, SameMachines),
            new("the kernel", there.Kernel, Kernel, SameMachines + $", or force one kernel on all of them with {LikelihoodKernel.Variable}"),
            new("the seed of the starts", Number(there.EstimateSeed), Number(EstimateSeed), Again),
            new("the seed of the bootstrap", Number(there.BootstrapSeed), Number(BootstrapSeed), Again),
            new("the number of parameters", Number(there.Parameters), Number(Parameters), Again),
            new("the bits of the estimate", Short(there.Estimate), Short(Estimate), SameMachines),
            new("the number of replicates", Number(there.Replicates), Number(Replicates), Again),
            new("the number of refits without a cluster", Number(there.Deletions), Number(Deletions), Again),
        ];
        return this == there ? null : marks.First(m => m.There != m.Here);

        static string Number(long value) => value.ToString(CultureInfo.InvariantCulture);
        static string Short(string sha256) => "SHA-256 " + sha256[..Math.Min(12, sha256.Length)];
    }
}

/// <summary>Something in which two origins differ.</summary>
/// <param name="What">What it is.</param>
/// <param name="There">What it is in the other origin.</param>
/// <param name="Here">What it is in this one.</param>
/// <param name="Remedy">What to do about it.</param>
internal sealed record OriginDifference(string What, string There, string Here, string Remedy)
{
    /// <summary>The difference as the middle of a sentence.</summary>
    public string Words => $"{What} ({There} there, {Here} here)";
}
