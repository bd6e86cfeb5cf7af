using System.Collections.Immutable;
using PanelChoice.Estimation;
using PanelChoice.Tests.Estimation;

namespace PanelChoice.Certificates;

/// <summary>A replicate that converged: what it says of its distance, and what the distance is.</summary>
/// <param name="Certificate">Its certificate.</param>
/// <param name="Distance">Its distance from where exact Newton steps end, in its own pooled standard errors; NaN where they end at no maximum.</param>
internal readonly record struct CertifiedReplicate(double Certificate, double Distance);

/// <summary>The replicates of one panel, by the way they went.</summary>
/// <param name="Panel">The panel; null where its fit ended at no maximum.</param>
/// <param name="Clusters">Number of clusters.</param>
/// <param name="OwnHessian">Refits side by side, each with its own Hessian at the full estimate.</param>
/// <param name="SampleHessian">The same refits where the sample's Hessian stands for theirs, as with very many clusters.</param>
/// <param name="Exact">Those of the first that did not settle and converged by exact Newton steps.</param>
/// <param name="Failed">Those that did not converge at all.</param>
internal sealed record Distances(
    DrawnPanel? Panel, int Clusters, ImmutableArray<CertifiedReplicate> OwnHessian, ImmutableArray<CertifiedReplicate> SampleHessian,
    ImmutableArray<CertifiedReplicate> Exact, int Failed)
{
    /// <summary>Makes and measures the replicates of panel number <paramref name="index"/>.</summary>
    public static Distances Of(StudyOptions options, int index)
    {
        var panel = DrawnPanel.Of(options.Seed, index);
        var model = Fits.Fit(panel.Design, panel.Form, 2);
        var clusters = panel.Design.Clusters.Length;
        if (model.Status != FitStatus.Converged) return new Distances(null, clusters, [], [], [], 0);
        var replicates = new Replicates(model);
        var requests = replicates.Draws(options.Draws, options.Seed + index).AddRange(replicates.Deletions(Math.Min(options.Deletions, clusters)));
        var told = replicates.Told(requests);

        var settled = replicates.SideBySide(told, options.Tolerance);
        var exact = ImmutableArray.CreateBuilder<CertifiedReplicate>();
        var failed = requests.Length - told.Length;
        for (var r = 0; r < told.Length; r++)
        {
            if (settled[r] is not null) continue;
            if (replicates.Exact(told[r]) is { Status: FitStatus.Converged } outcome) exact.Add(Measured(told[r], outcome));
            else failed++;
        }

        var scoresAlone = (long)clusters * model.Layout.Free.Length;
        return new Distances(panel, clusters, Of(settled), Of(replicates.SideBySide(told, options.Tolerance, scoresAlone)), exact.ToImmutable(), failed);

        ImmutableArray<CertifiedReplicate> Of(RefitOutcome?[] outcomes) =>
            [.. Enumerable.Range(0, told.Length).Where(r => outcomes[r] is not null).Select(r => Measured(told[r], outcomes[r]!))];
        CertifiedReplicate Measured(RefitRequest request, RefitOutcome outcome) => new(outcome.Decrement, replicates.Distance(request, outcome));
    }
}
