using System.Collections.Immutable;
using System.Runtime.InteropServices;
using PanelChoice.Design;
using PanelChoice.Estimation;
using PanelChoice.Study;

namespace PanelChoice.Inference;

/// <summary>What one contribution to the log-likelihood is.</summary>
public enum ContributionKind
{
    /// <summary>One occasion of one person.</summary>
    Occasion,

    /// <summary>All occasions of one person, where the likelihood is integrated over the person.</summary>
    Person,
}

/// <summary>What a free parameter is tested against.</summary>
/// <param name="Value">The value: 0 for a coefficient, the parent's dissimilarity (1 under the root) for a dissimilarity.</param>
/// <param name="Parameter">Index in the layout of the parameter that <paramref name="Value"/> is, when that one is estimated too; null otherwise.</param>
/// <param name="Withheld">Why there is no single value to test against; null when there is.</param>
public sealed record NullValue(double Value, int? Parameter, string? Withheld);

/// <summary>
/// All that the covariance estimators see of a fitted model. No name of a file, no tree, no formula of the likelihood is in it, so that
/// another likelihood gets every covariance by filling this record. K parameters are in the layout, F of them free; N contributions fall
/// into G clusters. Everything is in the user's units. At an interior maximum the covariance of a dissimilarity l from the natural-unit
/// Hessian equals the delta method from log l: d2/d(log l)2 = l^2 d2/dl2 + l d/dl, and the last term vanishes with the gradient.
/// </summary>
/// <param name="Estimates">K estimates, free and fixed.</param>
/// <param name="Labels">K names people read.</param>
/// <param name="Kinds">K kinds.</param>
/// <param name="Free">Indices of the F free parameters, ascending.</param>
/// <param name="Nulls">What each of the F free parameters is tested against.</param>
/// <param name="Contribution">What a contribution is.</param>
/// <param name="Contributions">N.</param>
/// <param name="Scores">Makes the sums of the derivatives of the weighted contributions on a number of threads; called only where there is a maximum.</param>
/// <param name="Information">F x F: minus the Hessian of the weighted log-likelihood, row by row.</param>
/// <param name="ClusterInformation">Makes its parts for a run of clusters, given the first and their number: that many x F x F, row by row; called only by
/// estimators that need them.</param>
/// <param name="ClusterBy">What a cluster is: "person", or the cluster column.</param>
/// <param name="Clusters">Names of the G clusters as sentences may give them: stand-ins where ids must not be passed on.</param>
/// <param name="ClusterOccasions">Occasions in each cluster.</param>
/// <param name="IsWeighted">Whether sampling weights other than 1 are in the log-likelihood.</param>
/// <param name="MeanWeight">Mean weight over occasions; 1 when unweighted.</param>
/// <param name="NoMaximum">Why the estimates are not an interior maximum, so that no covariance has a meaning; null when they are one.</param>
/// <param name="Refitter">Estimates the model again under other cluster weights.</param>
public sealed record InferenceInput(
    ImmutableArray<double> Estimates,
    ImmutableArray<string> Labels,
    ImmutableArray<ParameterKind> Kinds,
    ImmutableArray<int> Free,
    ImmutableArray<NullValue> Nulls,
    ContributionKind Contribution,
    int Contributions,
    Func<int, ScoreSums> Scores,
    ImmutableArray<double> Information,
    Func<int, int, ImmutableArray<double>> ClusterInformation,
    string ClusterBy,
    ImmutableArray<string> Clusters,
    ImmutableArray<int> ClusterOccasions,
    bool IsWeighted,
    double MeanWeight,
    string? NoMaximum,
    IRefitter Refitter)
{
    /// <summary>Where outcomes of numbered refits are found and kept; null when each is made here and lives as long as the run.</summary>
    public IRefitJournal? Journal { get; init; }

    /// <summary>The second grouping of two-way clustering; null where the study names none.</summary>
    public SecondClusters? Second { get; init; }

    /// <summary>
    /// Scores by cluster and information at other parameters (K) and cluster weights (G), for standard errors inside replicates; null where the likelihood
    /// has none. It is called from several threads at once.
    /// </summary>
    public Func<ImmutableArray<double>, ImmutableArray<double>, ReplicateEvidence>? Evidence { get; init; }

    /// <summary>What replicates that draw blocks of occasions are made from; null where whole clusters are drawn.</summary>
    internal BlockDraws? Blocks { get; init; }

    /// <summary>Most refits that may be at work at a time, where memory is short; no bit depends on it.</summary>
    internal int RefitsAtOnce { get; init; } = int.MaxValue;

    /// <summary>Number of occasions.</summary>
    public int Occasions => ClusterOccasions.Sum();

    /// <summary>What a fitted model offers to the covariance estimators.</summary>
    /// <param name="model">The fitted model.</param>
    /// <param name="refitter">Estimates it again.</param>
    /// <param name="clusterNames">Names of the design's clusters for use in sentences that are passed on; their own names when left out.</param>
    /// <exception cref="ArgumentException">There are not as many names as clusters.</exception>
    public static InferenceInput From(FittedModel model, IRefitter refitter, ImmutableArray<string> clusterNames = default)
    {
        ArgumentNullException.ThrowIfNull(model);
        ArgumentNullException.ThrowIfNull(refitter);
        var design = model.Design;
        var layout = model.Layout;
        var free = layout.Free;
        if (!clusterNames.IsDefault && clusterNames.Length != design.Clusters.Length)
            throw new ArgumentException("There are not as many names as clusters.", nameof(clusterNames));
        var occasions = new int[design.Clusters.Length];
        for (var p = 0; p < design.Persons; p++) occasions[design.ClusterOf[p]] += design.PersonStart[p + 1] - design.PersonStart[p];
        var weighted = design.PersonWeight.Any(w => w != 1);
        return new InferenceInput(
            model.Parameters,
            [.. layout.Parameters.Select(p => p.Label)],
            [.. layout.Parameters.Select(p => p.Kind)],
            free,
            [.. free.Select(k => NullOf(k, model))],
            ContributionKind.Occasion,
            design.Situations,
            _ => ScoreSums.Of(model),
            [.. free.SelectMany(r => free.Select(c => -model.Hessian[(r * layout.Count) + c]))],
            (first, count) => ClusterParts(model, first, count),
            design.ClusterBy,
            clusterNames.IsDefault ? design.Clusters : clusterNames,
            ImmutableCollectionsMarshal.AsImmutableArray(occasions),
            weighted,
            weighted ? MeanOverSituations(design) : 1,
            model.Status == FitStatus.Converged ? null : Unsettled(model.Status),
            refitter)
        {
            Evidence = (parameters, clusterWeight) => ReplicateErrors.At(model, parameters, clusterWeight),
        };
    }

    /// <summary>The mean weight over situations, summed in their order.</summary>
    private static double MeanOverSituations(ChoiceDesign design)
    {
        var sum = 0.0;
        for (var p = 0; p < design.Persons; p++)
            for (var s = design.PersonStart[p]; s < design.PersonStart[p + 1]; s++) sum += design.PersonWeight[p];
        return sum / design.Situations;
    }

    private static ImmutableArray<double> ClusterParts(FittedModel model, int firstCluster, int count)
    {
        var design = model.Design;
        var k = model.Layout.Count;
        var free = model.Layout.Free;
        var f = free.Length;
        var parts = new double[count * f * f];
        foreach (var (first, end) in PersonsOf(design, firstCluster, count))
        {
            var persons = model.Likelihood.PersonInformation(model.Parameters.AsSpan(), first, end);
            for (var p = first; p < end; p++)
            {
                var into = (design.ClusterOf[p] - firstCluster) * f * f;
                for (var r = 0; r < f; r++)
                    for (var c = 0; c < f; c++)
                        parts[into + (r * f) + c] += design.PersonWeight[p] * persons[((((p - first) * k) + free[r]) * k) + free[c]];
            }
        }

        return ImmutableCollectionsMarshal.AsImmutableArray(parts);
    }

    /// <summary>Runs of persons who belong to a run of clusters, ascending.</summary>
    private static IEnumerable<(int First, int End)> PersonsOf(ChoiceDesign design, int firstCluster, int count)
    {
        for (var p = 0; p < design.Persons; p++)
        {
            if (!IsIn(p)) continue;
            var first = p;
            while (p < design.Persons && IsIn(p)) p++;
            yield return (first, p);
        }

        bool IsIn(int person) => design.ClusterOf[person] >= firstCluster && design.ClusterOf[person] < firstCluster + count;
    }

    private static NullValue NullOf(int parameter, FittedModel model)
    {
        var layout = model.Layout;
        if (layout.Parameters[parameter].Kind == ParameterKind.Coefficient) return new NullValue(0, null, null);
        // In the unscaled form l is relative to the node above already: dissolving a nest with l = 1 changes nothing there, whatever its parent's.
        if (model.Form == NestedLogitForm.Unscaled) return new NullValue(1, null, null);
        var nests = layout.Nests.Where(n => n.Parameter == parameter).Select(n => ParentValue(n, model)).Distinct().ToList();
        return nests.Count == 1
            ? nests[0]
            : new NullValue(double.NaN, null, "The nests that share this dissimilarity stand under parents with different ones, so there is no single value to test it against.");
    }

    private static NullValue ParentValue(NestPlace nest, FittedModel model)
    {
        var layout = model.Layout;
        var above = nest.ParentNode;
        while (layout.Nests.FirstOrDefault(n => n.Node == above) is { } parent)
        {
            // A parent that shares this parameter, or that is never wide, sets no bound of its own: the next one above does.
            if (parent.Parameter == nest.Parameter || parent.Standing == NestStanding.NeverWider) above = parent.ParentNode;
            else return new NullValue(model.Parameters[parent.Parameter], layout.Parameters[parent.Parameter].IsFree ? parent.Parameter : null, null);
        }

        return new NullValue(1, null, null);
    }

    private static string Unsettled(FitStatus status) => status switch
    {
        FitStatus.NotIdentified => "Some terms are not identified, so there is no single maximum at which a standard error has a meaning.",
        FitStatus.Separated => "The likelihood rises without end along a direction of coefficients, so there is no maximum at which a standard error has a meaning.",
        FitStatus.Boundary => "A dissimilarity runs to the edge of its range, so there is no interior maximum at which a standard error has a meaning.",
        _ => "The optimiser stopped before a maximum, so a standard error has no meaning there.",
    };

    /// <summary>Fails on lengths that do not fit together; to be called where the estimators start.</summary>
    internal void CheckLengths()
    {
        var f = Free.Length;
        var fits = Labels.Length == Estimates.Length && Kinds.Length == Estimates.Length && Nulls.Length == f
            && Information.Length == f * f && ClusterOccasions.Length == Clusters.Length;
        if (!fits) throw new ArgumentException("The lengths of an inference input do not fit together.");
    }
}
