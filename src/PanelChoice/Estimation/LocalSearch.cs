using System.Collections.Immutable;
using PanelChoice.Likelihood;
using PanelChoice.Optimisation;
using PanelChoice.Study;

namespace PanelChoice.Estimation;

/// <summary>Where a search from one starting point ended.</summary>
internal enum SearchEndKind
{
    /// <summary>At an interior maximum.</summary>
    Maximum,

    /// <summary>So close to a maximum known before that it is the same one.</summary>
    Known,

    /// <summary>A dissimilarity runs to 0 or without end.</summary>
    Boundary,

    /// <summary>The likelihood rises without end along a direction of coefficients.</summary>
    Separated,

    /// <summary>The optimiser stopped before a maximum.</summary>
    Stopped,
}

/// <summary>What a search from one starting point came to.</summary>
/// <param name="Kind">Where it ended.</param>
/// <param name="Parameters">The best point seen, all K parameters.</param>
/// <param name="LogLikelihood">The log-likelihood there.</param>
/// <param name="Iterations">Steps tried.</param>
/// <param name="About">The dissimilarity that runs away, or the coefficients of the direction; empty otherwise.</param>
/// <param name="Direction">The direction of the K parameters along which the likelihood rises without end; empty otherwise.</param>
/// <param name="Known">Index of the known maximum; -1 otherwise.</param>
/// <param name="Last">The optimiser's own account.</param>
internal sealed record SearchEnd(
    SearchEndKind Kind, double[] Parameters, double LogLikelihood, int Iterations, ImmutableArray<int> About, double[] Direction, int Known,
    Minimum Last)
{
    /// <summary>The log-likelihood with all its derivatives at the point, where the optimiser's last evaluations include it; null otherwise.</summary>
    public LikelihoodEvaluation? Evaluation { get; init; }
}

/// <summary>A maximum found before, with what is needed to see that another search runs into it.</summary>
/// <param name="Parameters">All K parameters.</param>
/// <param name="LogLikelihood">The log-likelihood there.</param>
/// <param name="Coordinates">Its coordinates.</param>
/// <param name="Curvature">The Hessian of minus the log-likelihood in coordinates.</param>
internal sealed record KnownMaximum(double[] Parameters, double LogLikelihood, double[] Coordinates, double[] Curvature);

/// <summary>Runs the optimiser from one point and says where that leads: to a maximum, to a boundary, or away along a direction.</summary>
/// <param name="likelihood">The likelihood.</param>
/// <param name="form">Its form.</param>
/// <param name="personWeight">Weight of each person.</param>
/// <param name="scale">Scale of each column.</param>
/// <param name="cancellation">Stops between evaluations.</param>
internal sealed class LocalSearch(
    IChoiceLikelihood likelihood, NestedLogitForm form, double[] personWeight, double[] scale, CancellationToken cancellation)
{
    /// <summary>A dissimilarity below this, with the likelihood still rising (see IsStillRising), runs to 0: choices inside the nest are then ten
    /// thousand times as sharp as at the root.</summary>
    public const double NearZero = 1e-4;

    /// <summary>A dissimilarity above this, with the likelihood still rising, runs without end.</summary>
    public const double VeryLarge = 100;

    /// <summary>A dissimilarity below this at a decrement this small, with less information than this about its logarithm, has lost its say: the
    /// choices inside its nest are told with certainty, and the likelihood creeps towards 0 as exp(-1/l) does, below rounding.</summary>
    public const double Silent = 1e-6;

    private const double SilentDecrement = 1e-3;

    /// <summary>Beyond these values a search that stops on its way is asked whether the likelihood still rises.</summary>
    public const double Small = 0.01, Large = 30;

    /// <summary>A Newton step at least this long, in utilities for a column's standard deviation, at a decrement below that: the mark of separation.</summary>
    public const double SuspectStep = 0.3, SuspectDecrement = 0.1;

    /// <summary>Two points this close, in standard errors, with equal log-likelihood are the same maximum.</summary>
    public const double SameMaximum = 0.01;

    /// <summary>A direction's index may go against a choice by this share of its size and still count as rounding.</summary>
    private const double DirectionRounding = 1e-5;

    /// <summary>Maximises over some parameters, the others held.</summary>
    /// <param name="from">K parameters to start from.</param>
    /// <param name="active">Parameters that move.</param>
    /// <param name="settings">How to run the optimiser.</param>
    /// <param name="known">Maxima found before.</param>
    public SearchEnd Run(ReadOnlySpan<double> from, ImmutableArray<int> active, MinimisationSettings settings, IReadOnlyList<KnownMaximum> known)
    {
        var coefficients = likelihood.Design.Layout.Coefficients;
        var function = new MinusLogLikelihood(likelihood, personWeight, scale, active, from);
        var kind = SearchEndKind.Stopped;
        ImmutableArray<int> about = [];
        double[] direction = [];
        var joined = -1;

        bool Stop(Standing at)
        {
            for (var i = 0; i < active.Length; i++)
            {
                if (active[i] < coefficients) continue;
                var l = MinusLogLikelihood.Dissimilarity(at.Point[i]);
                var isSilent = l < 1 && at.Decrement < SilentDecrement && Math.Abs(at.At.Hessian[(i * active.Length) + i]) < Silent;
                var isFarOut = l < NearZero || l > VeryLarge;
                // Far out the way on can be a curved valley, in which the slope along l alone says little; then the valley is followed one step.
                if (!(isSilent && at.At.Gradient[i] > 0) && !(isFarOut && IsStillRising(function, at.Point, at.At.Value, active[i]))) continue;
                (kind, about) = (SearchEndKind.Boundary, [active[i]]);
                return true;
            }

            joined = Joined(at, known);
            if (joined >= 0)
            {
                kind = SearchEndKind.Known;
                return true;
            }

            if (RunsAway(at, function) is { } v)
            {
                direction = v;
                kind = SearchEndKind.Separated;
                about = [.. Enumerable.Range(0, coefficients).Where(k => v[k] != 0)];
                return true;
            }

            return false;
        }

        var minimum = TrustRegionNewton.Minimise(
            x =>
            {
                cancellation.ThrowIfCancellationRequested();
                return function.Evaluate(x);
            },
            function.Coordinates(from), settings, Stop);
        if (minimum.IsMinimum) kind = SearchEndKind.Maximum;
        else if (kind == SearchEndKind.Stopped)
        {
            var end = function.Parameters(minimum.Point);
            var k = active.FirstOrDefault(
                k => k >= coefficients && end[k] is < Small or > Large && IsStillRising(function, minimum.Point, minimum.Value, k), -1);
            if (k >= 0) (kind, about) = (SearchEndKind.Boundary, [k]);
        }

        return new SearchEnd(
            kind, function.Parameters(minimum.Point), function.LogLikelihood(minimum.Value), minimum.Iterations, about, direction, joined, minimum)
        {
            Evaluation = settings.UncheckedLastStep > 0 ? null : function.Behind(minimum.At),
        };
    }

    /// <summary>Whether the likelihood is no lower with a dissimilarity another factor 2 further out and everything else following it.</summary>
    private bool IsStillRising(MinusLogLikelihood function, double[] point, double value, int k)
    {
        var further = function.Parameters(point);
        further[k] *= further[k] < 1 ? 0.5 : 2;
        var rest = new MinusLogLikelihood(likelihood, personWeight, scale, function.Active.Remove(k), further);
        var best = TrustRegionNewton.Minimise(
            x =>
            {
                cancellation.ThrowIfCancellationRequested();
                return rest.Evaluate(x);
            },
            rest.Coordinates(further), new MinimisationSettings(Tolerance: 1e-4, MaxIterations: 60));
        return best.Value <= value;
    }

    /// <summary>The known maximum that a point belongs to: less than a hundredth of a standard error away; -1 for none.</summary>
    private static int Joined(Standing at, IReadOnlyList<KnownMaximum> known)
    {
        for (var m = 0; m < known.Count; m++)
            if (known[m].Coordinates.Length == at.Point.Length && Distance(known[m], at.Point) < SameMaximum) return m;
        return -1;
    }

    /// <summary>Distance of a point from a known maximum, in standard errors.</summary>
    public static double Distance(KnownMaximum known, ReadOnlySpan<double> point)
    {
        var n = point.Length;
        var sum = 0.0;
        for (var i = 0; i < n; i++)
            for (var j = 0; j < n; j++)
                sum += known.Curvature[(i * n) + j] * (point[i] - known.Coordinates[i]) * (point[j] - known.Coordinates[j]);
        return Math.Sqrt(Math.Max(0, sum));
    }

    /// <summary>
    /// The direction of the coefficients along which the likelihood rises without end, or null. Its mark is a Newton step that stays long
    /// while the gain it promises vanishes: along such a direction log P behaves like -exp(-t), whose Newton step is 1 for ever. The step's
    /// direction is then held against every choice of the sample.
    /// </summary>
    private double[]? RunsAway(Standing at, MinusLogLikelihood function)
    {
        if (at.Decrement > SuspectDecrement) return null;
        var along = at.Spectrum.Coordinates(at.At.Gradient);
        var floor = TrustRegionStep.Flat * at.Spectrum.Largest;
        for (var i = 0; i < along.Length; i++) along[i] = at.Spectrum.Values[i] > floor ? -along[i] / at.Spectrum.Values[i] : 0;
        var step = at.Spectrum.Combine(along);
        var coefficients = likelihood.Design.Layout.Coefficients;
        var longest = 0.0;
        for (var i = 0; i < step.Length; i++)
        {
            if (function.Active[i] >= coefficients) step[i] = 0;
            longest = Math.Max(longest, Math.Abs(step[i]));
        }

        if (longest < SuspectStep) return null;
        for (var i = 0; i < step.Length; i++) step[i] = Math.Abs(step[i]) < 1e-3 * longest ? 0 : step[i] / longest;
        var v = function.Direction(at.Point, step);
        return LinearIndex.NeverGoesAgainstChoices(likelihood.Design, form, function.Parameters(at.Point), v, personWeight, DirectionRounding) ? v : null;
    }
}
