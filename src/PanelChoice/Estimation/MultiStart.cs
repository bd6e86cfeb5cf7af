using System.Collections.Immutable;
using PanelChoice.Design;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;
using PanelChoice.Optimisation;
using PanelChoice.Study;

namespace PanelChoice.Estimation;

/// <summary>What the searches from all starting points came to.</summary>
/// <param name="Plain">
/// The plain logit (free dissimilarities held at their largest ordered value, 1 where nothing bounds them); on a thinned sample where it has a
/// maximum there and is but the place to start from.
/// </param>
/// <param name="Ends">Every search over all parameters, in the order it was run.</param>
/// <param name="Maxima">Distinct maxima, best first.</param>
/// <param name="EndsAt">How many searches ended at each of <paramref name="Maxima"/>.</param>
/// <param name="Active">Parameters that moved in the searches.</param>
internal sealed record MultiStartResult(
    SearchEnd Plain, ImmutableArray<SearchEnd> Ends, ImmutableArray<KnownMaximum> Maxima, ImmutableArray<int> EndsAt, ImmutableArray<int> Active);

/// <summary>
/// Searches from plain logit, from the user's own values, from the local maxima of the profile over a grid of dissimilarities, and from seeded
/// points. For given dissimilarities in order the likelihood is concave in the coefficients (Daganzo and Kusnic 1993), so that the profile
/// cannot be trapped; jointly it is not. When there are many persons each search is first run on a thinned sample of them; only what ends in
/// a maximum of its own there goes on to the whole sample. A search stops as soon as it comes within a hundredth of a standard error of a
/// maximum known before, so that many starts stay cheap.
/// </summary>
internal sealed class MultiStart
{
    private static readonly MinimisationSettings Loose = new(Tolerance: 0.03, MaxIterations: 60);
    private static readonly MinimisationSettings Near = new(Tolerance: 1e-4, MaxIterations: 60);
    private static readonly MinimisationSettings Tight = new();

    private readonly ChoiceDesign design;
    private readonly ImmutableArray<int> active;
    private readonly ImmutableArray<int> coefficients;
    private readonly double[] scale;
    private readonly StartingPoints points;
    private readonly LocalSearch search;
    private readonly LocalSearch? thinned;
    private readonly EstimateSettings settings;
    private readonly WorkContext work;
    private readonly List<SearchEnd> ends = [];
    private readonly List<KnownMaximum> maxima = [];
    private readonly List<int> endsAt = [];
    private readonly List<KnownMaximum> partMaxima = [];
    private readonly List<int> maximumOf = [];

    /// <summary>Prepares the searches.</summary>
    /// <param name="likelihood">The likelihood.</param>
    /// <param name="form">Its form.</param>
    /// <param name="active">Parameters to estimate.</param>
    /// <param name="scale">Scale of each column.</param>
    /// <param name="settings">Number of starts and seed.</param>
    /// <param name="work">Progress and cancellation.</param>
    public MultiStart(
        IChoiceLikelihood likelihood, NestedLogitForm form, ImmutableArray<int> active, double[] scale, EstimateSettings settings, WorkContext work)
    {
        design = likelihood.Design;
        this.active = active;
        this.scale = scale;
        this.settings = settings;
        this.work = work;
        coefficients = [.. active.Where(k => k < design.Layout.Coefficients)];
        points = new StartingPoints(design, form);
        var weight = design.PersonWeight.ToArray();
        search = new LocalSearch(likelihood, form, weight, scale, work.Cancellation);
        if (ThinnedSample.Weights(design) is { } part) thinned = new LocalSearch(likelihood, form, part, scale, work.Cancellation);
    }

    /// <summary>Runs all searches.</summary>
    /// <param name="start">K parameters: fixed values, the user's starting values, 0 for other coefficients, 1 for free dissimilarities.</param>
    /// <param name="hasOwnStart">Whether the user gave starting values.</param>
    public MultiStartResult Run(double[] start, bool hasOwnStart)
    {
        var isConcave = points.Free.IsEmpty && points.FixedAreInOrder();
        var total = isConcave ? 1 : Math.Max(1, settings.Starts);
        work.Report("starts", 0, total);
        var ones = Enumerable.Repeat(1.0, points.Free.Length).ToArray();
        var plainStart = points.With(start, ones);
        var moving = active;
        var plain = PlainOnPart(plainStart);
        if (plain is not null) Search(plain.Parameters, moving);
        if (plain is null || ends[^1].Kind == SearchEndKind.Separated)
        {
            ends.Clear();
            var near = thinned?.Run(plainStart, coefficients, Loose, []) is { Kind: SearchEndKind.Maximum } part ? part.Parameters : plainStart;
            plain = search.Run(near, coefficients, points.Free.IsEmpty ? Tight : Loose with { Tolerance = 1e-3, MaxIterations = 200 }, []);
            if (plain.Kind == SearchEndKind.Separated)
            {
                // What runs away is held where it is, so that the rest can still be estimated.
                moving = [.. active.Where(k => !plain.About.Contains(k))];
                total = 1;
            }

            if (points.Free.IsEmpty && plain.Kind != SearchEndKind.Separated) Keep(plain);
            else Search(plain.Parameters, moving);
        }

        work.Report("starts", ends.Count, total);

        foreach (var from in OtherStarts(start, hasOwnStart, plain.Parameters, total))
        {
            if (ends.Count >= total) break;
            Search(from, moving);
            work.Report("starts", ends.Count, total);
        }

        var order = Enumerable.Range(0, maxima.Count).OrderByDescending(m => maxima[m].LogLikelihood).ToArray();
        return new MultiStartResult(plain, [.. ends], [.. order.Select(m => maxima[m])], [.. order.Select(m => endsAt[m])], moving);
    }

    /// <summary>
    /// Plain logit on the thinned sample: as good a place to start from as that on all persons, at a fraction of its cost. Null where it is the
    /// result itself, or has no maximum there.
    /// </summary>
    private SearchEnd? PlainOnPart(double[] from) =>
        !points.Free.IsEmpty && thinned?.Run(from, coefficients, Loose, []) is { Kind: SearchEndKind.Maximum } end ? end : null;

    private IEnumerable<double[]> OtherStarts(double[] start, bool hasOwnStart, double[] plain, int total)
    {
        if (total <= 1) yield break;
        if (hasOwnStart) yield return start;
        if (!points.Free.IsEmpty)
            foreach (var from in ProfileMaxima(plain, total)) yield return from;
        for (var i = 0; i < total; i++) yield return points.Seeded(plain, active, scale, settings.Seed, i);
    }

    /// <summary>The local maxima of the profile over the grid, best first.</summary>
    private IEnumerable<double[]> ProfileMaxima(double[] plain, int total)
    {
        var grid = points.Grid();
        var ends = new SearchEnd[grid.Length];
        for (var i = 0; i < grid.Length; i++)
        {
            work.Report("starts", this.ends.Count, total);
            var done = grid[i].Neighbours.Where(n => n < i && ends[n].Kind == SearchEndKind.Maximum);
            var from = done.Any() ? ends[done.First()].Parameters : plain;
            ends[i] = (thinned ?? search).Run(points.With(from, grid[i].Values), coefficients, Loose, []);
        }

        double Height(int i) => ends[i].Kind == SearchEndKind.Maximum ? ends[i].LogLikelihood : double.NegativeInfinity;
        return Enumerable.Range(0, grid.Length)
            .Where(i => double.IsFinite(Height(i)) && grid[i].Neighbours.All(n => Height(n) <= Height(i)))
            .OrderByDescending(Height)
            .Select(i => ends[i].Parameters);
    }

    private void Search(double[] from, ImmutableArray<int> moving)
    {
        var near = thinned?.Run(from, moving, Near, partMaxima);
        if (near is { Kind: SearchEndKind.Known } && maximumOf[near.Known] >= 0)
        {
            Keep(near with { Known = maximumOf[near.Known] });
            return;
        }

        var start = near is { Kind: SearchEndKind.Maximum or SearchEndKind.Known } ? near.Parameters : from;
        var end = search.Run(start, moving, Tight, maxima);
        if (end.Kind == SearchEndKind.Stopped) end = search.Run(end.Parameters, moving, Tight with { InitialRadius = 0.5 }, maxima);
        Keep(end);
        if (near is not { Kind: SearchEndKind.Maximum }) return;
        partMaxima.Add(new KnownMaximum(near.Parameters, near.LogLikelihood, near.Last.Point, near.Last.At.Hessian));
        maximumOf.Add(end.Kind switch { SearchEndKind.Maximum => maxima.Count - 1, SearchEndKind.Known => end.Known, _ => -1 });
    }

    private void Keep(SearchEnd end)
    {
        ends.Add(end);
        if (end.Kind == SearchEndKind.Known) endsAt[end.Known]++;
        if (end.Kind != SearchEndKind.Maximum) return;
        maxima.Add(new KnownMaximum(end.Parameters, end.LogLikelihood, end.Last.Point, end.Last.At.Hessian));
        endsAt.Add(1);
    }
}
