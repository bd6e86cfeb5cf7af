using System.Collections.Immutable;
using System.Globalization;
using System.Runtime.InteropServices;
using PanelChoice.Covariates;
using PanelChoice.Data;
using PanelChoice.Design;
using PanelChoice.Panels;
using PanelChoice.Study;

namespace PanelChoice.Benchmarks;

/// <summary>
/// A seeded synthetic commute panel: constants, two attributes of every alternative, the last choice, (in M and L) a habit stock, waits of two
/// alternatives, terms of single alternatives, two nests of two. Attributes are either rounded as recorded ones are, so that their columns can
/// be stored as integers without loss (all but the habit stock, which is a recursion and has all digits), or not rounded at all.
/// </summary>
internal sealed record CommuteCase(CommuteShape Shape, bool IsRounded, CommuteMarket Market, CovariateSet Covariates, double[] Truth)
{
    /// <summary>The form of all benchmarks.</summary>
    public const NestedLogitForm Form = NestedLogitForm.UtilityScaled;

    /// <summary>How tables call the two ways of storing.</summary>
    public string Storage => IsRounded ? "coded" : "double";

    /// <summary>Draws a case; equal arguments give equal bits.</summary>
    /// <param name="shape">Size and terms.</param>
    /// <param name="isRounded">Whether attributes have two or three decimals; else all digits.</param>
    public static CommuteCase Make(CommuteShape shape, bool isRounded)
    {
        var market = CommuteMarket.Of(shape);
        double[] truth =
        [
            .. Enumerable.Range(1, shape.Alternatives - 1).Select(j => 0.4 * Math.Cos(j)), -0.6, -0.3, 0.8, .. shape.HasStock ? [0.5] : Array.Empty<double>(),
            -0.4, .. Enumerable.Range(0, shape.Singles).Select(s => 0.3 - (0.2 * s)), 0.6, 0.75,
        ];
        var draws = CommuteDraws.Of(shape, market, truth, isRounded);
        var names = market.Tree.Alternatives;
        var all = Enumerable.Range(0, names.Length).ToImmutableArray();
        var covariates = new List<Covariate>();
        foreach (var j in all.Remove(market.Base)) Add("constant", [j], [], true, names[j]);
        Add("time", all, draws.Time);
        Add("cost", all, draws.Cost);
        Add("same as last time", all, draws.Last);
        if (shape.HasStock) Add("habit", all, draws.Stock);
        Add("wait", market.Waiting, draws.Wait);
        for (var s = 0; s < shape.Singles; s++) Add($"single {s + 1}", [market.Single[s]], draws.Single[s]);
        return new CommuteCase(
            shape, isRounded, market,
            new CovariateSet(PanelOf(shape, names, draws), Whole(shape.Situations, o => o), [.. covariates], [], [], []), truth);

        void Add(string term, ImmutableArray<int> enters, double[] values, bool isConstant = false, string? alternative = null) => covariates.Add(
            new Covariate(
                term, alternative, enters, ImmutableCollectionsMarshal.AsImmutableArray(values), isConstant, CovariateRole.Present, null, null,
                covariates.Count));
    }

    /// <summary>The design for the kernels.</summary>
    public ChoiceDesign Design() => ChoiceDesignBuilder.Build(Covariates, Market.Tree, Market.Nests, Form);

    private static ChoicePanel PanelOf(CommuteShape shape, ImmutableArray<string> names, CommuteDraws draws)
    {
        var table = new ChoiceTable(
            "synthetic", new string('0', 64), [], new CodedColumn([], []), OccasionKind.WholeNumber, [], new CodedColumn([], names), [], [], [],
            ImmutableDictionary<string, ImmutableArray<double>>.Empty, ImmutableDictionary<string, CodedColumn>.Empty);
        var ids = Whole(shape.Persons, p => (p + 1).ToString(CultureInfo.InvariantCulture));
        return new ChoicePanel(
            table, ids, names,
            Whole(shape.Persons + 1, p => p * shape.Occasions),
            Whole(shape.Situations, o => o / shape.Occasions),
            Whole(shape.Situations, o => (long)(o % shape.Occasions) + 1),
            [], ImmutableCollectionsMarshal.AsImmutableArray(draws.Offered), ImmutableCollectionsMarshal.AsImmutableArray(draws.Chosen),
            Whole(shape.Persons, _ => 1.0), "person", ids, Whole(shape.Persons, p => p));
    }

    private static ImmutableArray<T> Whole<T>(int count, Func<int, T> value)
    {
        var items = new T[count];
        for (var i = 0; i < count; i++) items[i] = value(i);
        return ImmutableCollectionsMarshal.AsImmutableArray(items);
    }
}
