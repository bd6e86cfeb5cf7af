using System.Collections.Immutable;
using PanelChoice.Design;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;
using PanelChoice.Study;

namespace PanelChoice.Estimation;

/// <summary>Full-information maximum likelihood: what can be told apart, searches from many starts, and how the fit ended.</summary>
public static class MaximumLikelihood
{
    /// <summary>Condition number of the scaled information above which terms can hardly be told apart: the root, 1,000, is ten times what
    /// Belsley, Kuh and Welsch 1980 ("Regression Diagnostics") call severe.</summary>
    internal const double WeakCondition = 1e6;

    /// <summary>A gradient below this, in standard errors and beside flat directions, leaves nothing to gain.</summary>
    private const double SettledGradient = 1e-3;

    /// <summary>Fits a model under the design's sampling weights. Numerical trouble is a status with findings, never an exception.</summary>
    /// <param name="likelihood">The likelihood.</param>
    /// <param name="form">The form it was made with.</param>
    /// <param name="settings">Number of starts and seed.</param>
    /// <param name="work">Threads for the checks, progress ("starts") and cancellation.</param>
    /// <exception cref="OperationCanceledException">The run was cancelled.</exception>
    public static FittedModel Fit(IChoiceLikelihood likelihood, NestedLogitForm form, EstimateSettings settings, WorkContext work)
    {
        ArgumentNullException.ThrowIfNull(likelihood);
        ArgumentNullException.ThrowIfNull(settings);
        ArgumentNullException.ThrowIfNull(work);
        var design = likelihood.Design;
        var layout = design.Layout;
        var weight = design.PersonWeight.ToArray();
        var findings = new FitFindings(design, form);
        var found = new List<FitFinding>();

        var survey = ColumnSurvey.Of(design, work.Threads);
        var evidence = survey.Whole();
        var redundant = Identification.Check(likelihood, form, evidence, survey.Scale, work.Threads);
        found.AddRange(redundant.Select(findings.Redundant));
        ImmutableArray<int> held = [.. redundant.Select(r => r.Parameter)];
        ImmutableArray<int> active = [.. layout.Free.Except(held)];
        var oneSided = Separation.OneSided(design, form, evidence, active, weight);
        found.AddRange(oneSided.Select(k => findings.OneSided(k, evidence[k], survey.IsEverChosen)));

        var starts = new MultiStart(likelihood, form, active, survey.Scale, settings, work);
        var result = starts.Run(StartingValues(layout, held), layout.Parameters.Any(p => p is { IsFree: true, Start: not null }));

        var separated = !oneSided.IsEmpty || result.Plain.Kind == SearchEndKind.Separated;
        if (result.Plain.Kind == SearchEndKind.Separated && !result.Plain.About.All(oneSided.Contains)) found.Add(findings.Separated(result.Plain));

        var (best, kind) = Best(result, MinusLogLikelihood.MeanWeight(design, weight));
        if (kind == SearchEndKind.Separated && !best.About.All(oneSided.Contains)) found.Add(findings.Separated(best));
        if (kind == SearchEndKind.Boundary)
            found.Add(findings.Boundary(best, result.Maxima.IsEmpty ? null : result.Maxima[0].LogLikelihood));

        var function = new MinusLogLikelihood(likelihood, weight, survey.Scale, active, best.Parameters);
        var final = best.Evaluation ?? likelihood.Evaluate(best.Parameters, weight, Derivatives.Hessian);
        var curvature = Curvature.Of(likelihood, function, function.InCoordinates(best.Parameters, final), best.Parameters, weight);
        // On a flat ridge the optimiser may stop for want of a better point: then the ridge is the finding, not the stop.
        var isSettled = kind == SearchEndKind.Maximum || (kind == SearchEndKind.Stopped && curvature.GradientNorm < SettledGradient);
        var isFlat = isSettled && !separated && !curvature.IsIdentified;
        if (isFlat) found.Add(findings.Flat(curvature));
        else if (kind == SearchEndKind.Stopped && !separated) found.Add(FitFindings.Stopped(best));
        else if (kind == SearchEndKind.Maximum && !separated && curvature.Condition > WeakCondition) found.Add(findings.Weak(curvature));

        var status = !held.IsEmpty || isFlat ? FitStatus.NotIdentified
            : separated || kind == SearchEndKind.Separated ? FitStatus.Separated
            : kind == SearchEndKind.Boundary ? FitStatus.Boundary
            : kind == SearchEndKind.Stopped ? FitStatus.Stopped
            : FitStatus.Converged;
        found.AddRange(findings.NeverWider());
        if (status == FitStatus.Converged) found.AddRange(findings.OutsideRange(best.Parameters));
        ImmutableArray<Optimum> optima = separated
            ? []
            : [.. result.Maxima.Select((m, i) => new Optimum(m.LogLikelihood, result.EndsAt[i], [.. m.Parameters]))];
        if (optima.Length > 1) found.Add(FitFindings.SeveralMaxima(optima, result.Ends.Length));

        var reference = ReferenceFits.Of(design, weight);
        return new FittedModel(
            likelihood, form, status, [.. best.Parameters], final.Value, reference.EqualProbability, reference.Constants(), final.Hessian,
            curvature.GradientNorm, best.Iterations, settings.Starts, optima.Sum(o => o.Starts), optima, [.. found])
        {
            Held = held,
            Survey = survey,
        };
    }

    private static double[] StartingValues(ParameterLayout layout, ImmutableArray<int> held)
    {
        var start = new double[layout.Count];
        for (var k = 0; k < start.Length; k++)
        {
            var p = layout.Parameters[k];
            start[k] = p.Fixed ?? (held.Contains(k) ? 0 : p.Start ?? (p.Kind == ParameterKind.Dissimilarity ? 1 : 0));
        }

        return start;
    }

    /// <summary>
    /// The highest point of all searches. A search that leaves the interior counts as the winner only where it ends visibly above every
    /// maximum; otherwise the best maximum does.
    /// </summary>
    private static (SearchEnd End, SearchEndKind Kind) Best(MultiStartResult result, double unit)
    {
        var maximum = result.Ends.Where(e => e.Kind == SearchEndKind.Maximum).MaxBy(e => e.LogLikelihood);
        var other = result.Ends.Where(e => e.Kind is not (SearchEndKind.Maximum or SearchEndKind.Known)).MaxBy(e => e.LogLikelihood);
        if (maximum is not null && (other is null || other.LogLikelihood <= maximum.LogLikelihood + (1e-6 * unit))) return (maximum, maximum.Kind);
        return (other!, other!.Kind);
    }
}
