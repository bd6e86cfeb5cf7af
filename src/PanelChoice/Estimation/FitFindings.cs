using System.Collections.Immutable;
using System.Globalization;
using PanelChoice.Design;
using PanelChoice.Study;

namespace PanelChoice.Estimation;

/// <summary>The sentences about a fit: each names the terms or nests it is about.</summary>
/// <param name="design">The design.</param>
/// <param name="form">Its form.</param>
internal sealed class FitFindings(ChoiceDesign design, NestedLogitForm form)
{
    private readonly ParameterLayout layout = design.Layout;

    public FitFinding Redundant(Redundancy r) => r.With.IsEmpty
        ? new FitFinding("fit.no_variation", $"'{Label(r.Parameter)}' has the same value for all offered alternatives of every choice set, so no "
            + "choice can tell its coefficient; it is held at 0.", [r.Parameter])
        : new FitFinding("fit.collinear", $"'{Label(r.Parameter)}' is, inside every choice set, a linear combination of {Labels(r.With)}; their "
            + $"coefficients cannot be told apart, and that of '{Label(r.Parameter)}' is held at 0. Leave one of them out.", [r.Parameter, .. r.With]);

    public FitFinding Flat(Curvature curvature) => new(
        "fit.not_identified", $"The probabilities of all choices stay the same when {Labels(curvature.Weakest)} move together in one direction; the "
            + "sample cannot tell them apart, and the values shown are one of many that fit equally well.", curvature.Weakest);

    public FitFinding Weak(Curvature curvature) => new(
        "fit.weakly_identified", "The information matrix is close to singular (condition number "
            + $"{curvature.Condition.ToString("G2", CultureInfo.InvariantCulture)} after scaling); {Labels(curvature.Weakest)} can hardly be told apart.",
        curvature.Weakest);

    public FitFinding OneSided(int parameter, Evidence evidence, bool[] isEverChosen)
    {
        var falls = !evidence.HasFlag(Evidence.ChosenHasMore);
        var own = design.Columns.Where(c => c.Parameter == parameter).Select(c => c.Alternative).Distinct().ToArray();
        var why = own.Length == 1 && !isEverChosen[own[0]]
            ? $"'{design.Tree.Alternatives[own[0]]}' is never chosen where '{Label(parameter)}' tells it from the other alternatives"
            : $"no choice goes against a {(falls ? "lower" : "higher")} coefficient of '{Label(parameter)}'";
        return new FitFinding(
            "fit.separated", $"The likelihood rises without end as the coefficient of '{Label(parameter)}' {(falls ? "falls" : "rises")}: {why}. "
                + "It has no finite maximum; leave the term out or merge what it separates.", [parameter]);
    }

    public FitFinding Separated(SearchEnd end)
    {
        string Side(Func<double, bool> side) => Labels([.. end.About.Where(k => side(end.Direction[k]))]);
        var up = end.About.Any(k => end.Direction[k] > 0) ? $"raising {Side(d => d > 0)}" : "";
        var down = end.About.Any(k => end.Direction[k] < 0) ? $"lowering {Side(d => d < 0)}" : "";
        var how = up.Length > 0 && down.Length > 0 ? $"{up} and {down} together" : up + down;
        return new FitFinding(
            "fit.separated", $"The likelihood rises without end along a direction of coefficients: {how} never makes any choice of the sample less likely. "
                + "These coefficients have no finite maximum; leave one of the terms out or merge what they separate.", end.About);
    }

    public FitFinding Boundary(SearchEnd end, double? bestInterior)
    {
        var nest = NestOf(end.About[0]);
        var interior = bestInterior is { } l
            ? $" The best interior maximum, at log-likelihood {Number(l)}, lies below the value reached there, {Number(end.LogLikelihood)}."
            : "";
        return end.Parameters[end.About[0]] < 1
            ? new FitFinding("fit.boundary", $"The dissimilarity of nest '{nest}' runs to 0: the likelihood keeps rising towards that edge and has no interior "
                + $"maximum.{interior} The nest does not fit these choices; dissolve it or fix its dissimilarity.", end.About)
            : new FitFinding("fit.boundary", $"The dissimilarity of nest '{nest}' grows without end: the likelihood keeps rising and has no interior "
                + $"maximum.{interior} The nest does not fit these choices; dissolve it or fix its dissimilarity.", end.About);
    }

    public static FitFinding Stopped(SearchEnd end) => new(
        "fit.stopped", $"The optimiser stopped before a maximum ({end.Last.Termination switch
        {
            Optimisation.Termination.IterationLimit => $"after {end.Iterations} iterations",
            Optimisation.Termination.StartNotFinite => "the log-likelihood is not finite at the starting values",
            _ => "no step improved the log-likelihood",
        }}); the values shown are the best seen, not an estimate.", []);

    public IEnumerable<FitFinding> NeverWider()
    {
        foreach (var place in layout.Nests)
            if (place.Standing == NestStanding.NeverWider)
                yield return new FitFinding(
                    "fit.never_wider", $"Nest '{place.Name}' is never more than one alternative wide in the sample, so its dissimilarity has no say in any choice; "
                        + "it is not estimated and stands at its parent's value.", [place.Parameter]);
    }

    public IEnumerable<FitFinding> OutsideRange(ReadOnlySpan<double> parameters)
    {
        var found = new List<FitFinding>();
        foreach (var place in layout.Nests)
        {
            if (!NestOrder.Matters(place, form)) continue;
            var above = NestOrder.Above(design, form, place.Node);
            var bound = above < 0 ? 1 : parameters[above];
            if (parameters[place.Parameter] <= bound) continue;
            if (!layout.Parameters[place.Parameter].IsFree && (above < 0 || !layout.Parameters[above].IsFree)) continue;
            var own = Apart(parameters[place.Parameter], bound);
            var what = above < 0 ? "above 1" : $"above its parent's {Number(bound)}";
            found.Add(new FitFinding(
                "fit.outside_range", $"The dissimilarity of nest '{place.Name}' is {own}, {what}: outside the range that is "
                    + "consistent with utility maximisation for all values of the covariates. Its test against that bound says how far this could be chance.",
                [place.Parameter]));
        }

        return found;
    }

    public static FitFinding SeveralMaxima(ImmutableArray<Optimum> optima, int starts) => new(
        "fit.several_maxima", $"{optima.Length} distinct maxima were found from {starts} starts; the best, {Number(optima[0].LogLikelihood)}, "
            + $"was reached from {optima[0].Starts}, the next has log-likelihood {Number(optima[1].LogLikelihood)}.", []);

    private string NestOf(int parameter) => layout.Nests.First(p => p.Parameter == parameter).Name;

    private string Label(int parameter) => layout.Parameters[parameter].Kind == ParameterKind.Dissimilarity
        ? $"dissimilarity of {layout.Parameters[parameter].Label}"
        : layout.Parameters[parameter].Label;

    private string Labels(ImmutableArray<int> parameters) => parameters.Length switch
    {
        0 => "nothing",
        1 => $"'{Label(parameters[0])}'",
        _ => string.Join(", ", parameters.Take(parameters.Length - 1).Select(k => $"'{Label(k)}'")) + $" and '{Label(parameters[^1])}'",
    };

    /// <summary>A value with as many digits as tell it from a bound in print.</summary>
    private static string Apart(double value, double bound)
    {
        var text = Number(value);
        for (var digits = 4; text == Number(bound) && digits < 17; digits++)
        {
            text = value.ToString("0." + new string('#', digits), CultureInfo.InvariantCulture);
        }

        return text;
    }

    private static string Number(double value) => value.ToString("0.###", CultureInfo.InvariantCulture);
}
