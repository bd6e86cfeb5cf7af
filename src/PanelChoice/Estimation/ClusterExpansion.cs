using System.Collections.Immutable;
using System.Numerics.Tensors;
using System.Runtime.InteropServices;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;
using PanelChoice.Optimisation;

namespace PanelChoice.Estimation;

/// <summary>What is known of a replicate at the full estimate.</summary>
/// <param name="At">Its log-likelihood there (without its value), with its derivatives.</param>
/// <param name="HessianError">
/// Where the Hessian is the sample's, scaled to the replicate's weight: its expected distance from the replicate's own, as a share of it (the root of the mean
/// squared Frobenius norm over draws, which bounds that of the largest share in any direction). 0 where it is the replicate's own.
/// </param>
internal sealed record ReplicateStart(LikelihoodEvaluation At, double HessianError);

/// <summary>
/// The log-likelihood of each cluster to second order around the full estimate, and that of the sample to third order. One pass makes it; after that any
/// replicate has its score, its exact Hessian and nearly its third derivatives at the full estimate without reading the data.
/// </summary>
internal sealed class ClusterExpansion
{
    /// <summary>
    /// Doubles that scores and Hessians may take: 64 megabytes. With more clusters the Hessian of the whole sample stands for each replicate's: they differ by a
    /// share of about one over the root of the number of clusters. Scores alone may take twice as much.
    /// </summary>
    public const long MostEntries = 1L << 23;

    /// <summary>Replicates summed by one thread at a time.</summary>
    private const int SummedTogether = 8;

    private readonly FittedModel model;
    private readonly bool holdsHessians;
    private readonly int stride;
    private readonly double[] rows;
    private readonly double[] situations;
    private readonly double[] hessianShares;
    private readonly double allSituations;

    private ClusterExpansion(FittedModel model, double[] scale, ImmutableArray<int> active, bool holdsHessians)
    {
        this.model = model;
        this.holdsHessians = holdsHessians;
        Scale = scale;
        Active = active;
        var n = active.Length;
        stride = n + (holdsHessians ? n * (n + 1) / 2 : 0);
        rows = new double[(long)model.Design.Clusters.Length * stride];
        situations = new double[model.Design.Clusters.Length];
        hessianShares = new double[holdsHessians ? 0 : model.Design.Clusters.Length];
        var design = model.Design;
        for (var p = 0; p < design.Persons; p++)
            situations[design.ClusterOf[p]] += design.PersonWeight[p] * (design.PersonStart[p + 1] - design.PersonStart[p]);
        foreach (var s in situations) allSituations += s;
    }

    /// <summary>Scale of each column.</summary>
    public double[] Scale { get; }

    /// <summary>The n parameters that were estimated.</summary>
    public ImmutableArray<int> Active { get; }

    /// <summary>
    /// n x n x n third derivatives of minus the log-likelihood by the coordinates of <see cref="MinusLogLikelihood"/>, for each situation with its weight
    /// scaled to mean 1.
    /// </summary>
    public double[] Third { get; private set; } = [];

    /// <summary>Expands a fitted model.</summary>
    /// <param name="model">The model, at a maximum.</param>
    /// <param name="likelihood">Its likelihood.</param>
    /// <param name="scale">Scale of each column.</param>
    /// <param name="mostEntries">Doubles that scores and Hessians may take.</param>
    /// <param name="cancellation">Stops between stretches of persons.</param>
    /// <returns>The expansion; null where not even the clusters' scores may be held, or the sample's Hessian is not that of a maximum.</returns>
    public static ClusterExpansion? Of(
        FittedModel model, IChoiceLikelihood likelihood, double[] scale, long mostEntries, CancellationToken cancellation)
    {
        ImmutableArray<int> active = [.. model.Layout.Free.Except(model.Held)];
        long n = active.Length;
        long clusters = model.Design.Clusters.Length;
        var entries = Entries(clusters, n, mostEntries);
        if (entries == 0) return null;
        var expansion = new ClusterExpansion(model, scale, active, holdsHessians: entries > clusters * n);
        if (expansion.InverseOfSample() is not { } inverse) return null;
        expansion.AddPersons(likelihood, inverse, cancellation);
        expansion.Third = expansion.ThirdDerivatives(likelihood);
        return expansion;
    }

    /// <summary>Doubles that scores, and Hessians where they may be held too, of so many clusters take; 0 where not even the scores may be held.</summary>
    /// <param name="clusters">Number of clusters.</param>
    /// <param name="parameters">Number of parameters that were estimated.</param>
    /// <param name="mostEntries">Doubles that scores and Hessians may take.</param>
    public static long Entries(long clusters, long parameters, long mostEntries)
    {
        var (scores, all) = (clusters * parameters, clusters * (parameters + (parameters * (parameters + 1) / 2)));
        return all <= mostEntries ? all : scores <= 2 * mostEntries ? scores : 0;
    }

    /// <summary>
    /// What is known of some replicates at the full estimate. What a replicate gets depends on its own weights alone.
    /// </summary>
    /// <param name="clusterWeights">Weight of each cluster, replicate by replicate.</param>
    /// <param name="threads">Threads, 1 or more.</param>
    public ReplicateStart[] At(IReadOnlyList<ImmutableArray<double>> clusterWeights, int threads)
    {
        var starts = new ReplicateStart[clusterWeights.Count];
        var groups = (starts.Length + SummedTogether - 1) / SummedTogether;
        FixedChunks.Run(groups, threads, (_, first, end) =>
        {
            for (var group = first; group < end; group++)
            {
                var from = group * SummedTogether;
                Sum(clusterWeights, from, starts.AsSpan(from, Math.Min(SummedTogether, starts.Length - from)));
            }
        });
        return starts;
    }

    private void Sum(IReadOnlyList<ImmutableArray<double>> clusterWeights, int from, Span<ReplicateStart> starts)
    {
        var sums = new double[starts.Length * stride];
        var counts = new double[starts.Length];
        for (var g = 0; g < situations.Length; g++)
        {
            var row = rows.AsSpan(g * stride, stride);
            for (var r = 0; r < counts.Length; r++)
            {
                var weight = clusterWeights[from + r][g];
                if (weight == 0) continue;
                counts[r] += weight * situations[g];
                var sum = sums.AsSpan(r * stride, stride);
                TensorPrimitives.MultiplyAdd(row, weight, sum, sum);
            }
        }

        for (var r = 0; r < counts.Length; r++)
        {
            var share = counts[r] / allSituations;
            starts[r] = new ReplicateStart(Expand(sums.AsSpan(r * stride, stride), share), HessianError(clusterWeights[from + r].AsSpan(), share));
        }
    }

    /// <summary>sqrt(sum over clusters of (w_g / share - 1)^2 |H^-1/2 H_g H^-1/2|^2), w_g the cluster's weight in the replicate, H_g its Hessian, H the sample's.</summary>
    private double HessianError(ReadOnlySpan<double> clusterWeight, double share)
    {
        var sum = 0.0;
        for (var g = 0; g < hessianShares.Length; g++)
        {
            var off = ((clusterWeight[g] / share) - 1) * hessianShares[g];
            sum += off * off;
        }

        return Math.Sqrt(sum);
    }

    /// <summary>K first and K x K second derivatives from a row of sums.</summary>
    /// <param name="sums">The sums.</param>
    /// <param name="share">Weight of the replicate as a share of the sample's.</param>
    private LikelihoodEvaluation Expand(ReadOnlySpan<double> sums, double share)
    {
        var K = model.Layout.Count;
        var gradient = new double[K];
        var hessian = new double[K * K];
        var place = Active.Length;
        for (var i = 0; i < Active.Length; i++)
        {
            gradient[Active[i]] = sums[i];
            for (var j = 0; j <= i; j++)
            {
                var (r, c) = (Active[i], Active[j]);
                hessian[(r * K) + c] = hessian[(c * K) + r] = holdsHessians ? sums[place++] : share * model.Hessian[(r * K) + c];
            }
        }

        return new LikelihoodEvaluation(0, ImmutableCollectionsMarshal.AsImmutableArray(gradient), ImmutableCollectionsMarshal.AsImmutableArray(hessian));
    }

    /// <summary>The inverse of minus the sample's Hessian, n x n; null where it is not positive definite.</summary>
    private double[]? InverseOfSample()
    {
        var (n, K) = (Active.Length, model.Layout.Count);
        double[] information = [.. Active.SelectMany(r => Active.Select(c => -model.Hessian[(r * K) + c]))];
        return ScaledCholesky.Factor(information, n, out _)?.Inverse();
    }

    private void AddPersons(IChoiceLikelihood likelihood, double[] inverse, CancellationToken cancellation)
    {
        var design = model.Design;
        var (n, K) = (Active.Length, model.Layout.Count);
        var own = new double[n * n];
        SeparatePasses.Of(likelihood).ForEachPerson([.. model.Parameters], (person, score, hessian) =>
        {
            var weight = design.PersonWeight[person];
            var row = rows.AsSpan(design.ClusterOf[person] * stride, stride);
            for (var i = 0; i < Active.Length; i++) row[i] += weight * score[Active[i]];
            if (!holdsHessians)
            {
                // The sizes of a cluster's persons add up to at least the size of their sum.
                for (var i = 0; i < own.Length; i++) own[i] = hessian[(Active[i / n] * K) + Active[i % n]];
                hessianShares[design.ClusterOf[person]] += weight * Math.Sqrt(SymmetricProduct.SquaredShare(own, inverse, n));
                return;
            }

            var place = Active.Length;
            for (var i = 0; i < Active.Length; i++)
                for (var j = 0; j <= i; j++) row[place++] += weight * hessian[(Active[i] * K) + Active[j]];
        }, cancellation);
    }

    /// <summary>Differences of exact Hessians on the thinned sample: third derivatives only correct the Hessian for the way to a replicate, by a few percent.</summary>
    private double[] ThirdDerivatives(IChoiceLikelihood likelihood)
    {
        // Rounding is 1e-12 of the Hessian and the next term of the difference 1e-4 of it: both far below what the thinned sample leaves open.
        const double Step = 1e-4;
        var n = Active.Length;
        var function = new MinusLogLikelihood(likelihood, ThinnedSample.WeightsOrAll(model.Design), Scale, Active, model.Parameters.AsSpan());
        var x = function.Coordinates(model.Parameters.AsSpan());
        var here = function.Evaluate(x).Hessian;
        var unit = Step * function.Situations;
        var third = new double[n * n * n];
        for (var k = 0; k < n; k++)
        {
            var beside = (double[])x.Clone();
            beside[k] += Step;
            var there = function.Evaluate(beside).Hessian;
            for (var i = 0; i < n * n; i++) third[(k * n * n) + i] = (there[i] - here[i]) / unit;
        }

        return third;
    }
}
