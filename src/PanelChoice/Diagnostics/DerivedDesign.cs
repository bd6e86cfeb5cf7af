using System.Collections.Immutable;
using System.Runtime.InteropServices;
using PanelChoice.Covariates;
using PanelChoice.Data;
using PanelChoice.Design;
using PanelChoice.Panels;
using PanelChoice.Study;

namespace PanelChoice.Diagnostics;

/// <summary>
/// Makes the design on which the cause is judged from the blocks of the study's own design, where all it needs stands in them: reading the data again
/// would take longer than all tests of independence. What comes out is bit for bit what the data would give, because columns are held only in ways in which
/// every value comes back. A mean is taken over a column that is in the design as it was recorded; where one is asked for of a column that
/// enters with a lag, a factor or a scale alone, there is no derived design.
/// </summary>
internal sealed class DerivedDesign
{
    /// <summary>A covariate of the derived design and the coefficient of the main one whose covariate it is, or is the mean of.</summary>
    private sealed record Derived(Covariate Head, int From, bool IsMean);

    private static readonly ChoiceTable NoTable = new(
        "", "", [], new CodedColumn([], []), OccasionKind.None, [], new CodedColumn([], []), [], [], [],
        ImmutableDictionary<string, ImmutableArray<double>>.Empty, ImmutableDictionary<string, CodedColumn>.Empty);

    private readonly ChoiceDesign main;
    private readonly EstimationSample sample;
    private readonly ImmutableArray<Derived> covariates;
    private readonly bool isWithoutFirst;
    private readonly int J;
    private readonly BlockReader reader;

    private DerivedDesign(ChoiceDesign main, EstimationSample sample, ImmutableArray<Derived> covariates, bool isWithoutFirst)
    {
        this.main = main;
        this.sample = sample;
        this.covariates = covariates;
        this.isWithoutFirst = isWithoutFirst;
        J = main.Alternatives;
        reader = main.Store.Reader();
    }

    /// <summary>Derives it; null where the data have to be asked.</summary>
    /// <param name="study">The study.</param>
    /// <param name="sample">The sample of the study's design.</param>
    /// <param name="main">The study's design.</param>
    /// <param name="terms">The study's terms that stay.</param>
    /// <param name="means">The mean terms, which follow them.</param>
    /// <param name="target">Where blocks of a format go.</param>
    public static ChoiceDesign? Of(
        StudySpecification study, EstimationSample sample, ChoiceDesign main, ImmutableArray<TermSpecification> terms, ImmutableArray<TermSpecification> means,
        Func<BlockFormat, IBlockTarget> target)
    {
        var isWithoutFirst = TermDirection.AnyLooksBack(study.Terms);
        // There a person's first working day is the first occasion, which the number of earlier records does not tell.
        if (isWithoutFirst && study.History.Previous == PreviousRule.Workday) return null;
        var covariates = ImmutableArray.CreateBuilder<Derived>();
        for (var k = 0; k < sample.Covariates.Length; k++)
            if (!StaticDesign.IsPastChoice(study.Terms[sample.Covariates[k].TermIndex])) covariates.Add(new Derived(sample.Covariates[k] with { Values = [] }, k, false));
        foreach (var mean in means)
        {
            if (terms.FirstOrDefault(t => IsMeanOf(mean, t)) is not { } term) return null;
            for (var k = 0; k < sample.Covariates.Length; k++)
                if (study.Terms[sample.Covariates[k].TermIndex] == term)
                    covariates.Add(new Derived(
                        sample.Covariates[k] with { Term = mean.Name, Values = [], Role = TermDirection.Role(mean.Source), Fixed = null, Start = null }, k, true));
        }

        return new DerivedDesign(main, sample, covariates.DrainToImmutable(), isWithoutFirst).Build(study, target);
    }

    private static bool IsMeanOf(TermSpecification mean, TermSpecification term) =>
        term.Source is ColumnSource { Moment: Now, Levels: false } source && mean.Source == source with { Moment = new PersonMean() }
        && term is { Times: null, Scale: 1 } && mean is { Times: null, Scale: 1 } && term.Log == mean.Log
        && term.Each == mean.Each && term.Base == mean.Base && term.Alternatives.SequenceEqual(mean.Alternatives);

    private ChoiceDesign? Build(StudySpecification study, Func<BlockFormat, IBlockTarget> open)
    {
        var survey = new DesignSurvey(main.Tree);
        var terms = covariates.Where(c => c.IsMean).GroupBy(c => c.Head.Term, StringComparer.Ordinal).Select(g => new CommonValue([.. g], J)).ToArray();
        foreach (var block in main.Blocks)
        {
            var part = Part(block);
            survey.Add(part, 0);
            foreach (var term in terms) term.Look(part, covariates);
        }

        // A mean that cancels out is a problem in words, which the data's own way has.
        if (terms.Any(t => t.Cancels)) return null;
        var plan = DesignPlan.Of(
            survey, [.. covariates.Select(c => c.Head)], _ => true, main.Tree, study.Nests, study.Estimate.Form, main.ClusterBy, main.Clusters);
        var target = open(plan.Format);
        var filler = new DesignFiller(plan, target);
        foreach (var block in main.Blocks) filler.Add(Part(block));
        return plan.On(target.Complete());
    }

    /// <summary>The covariates of a block's persons.</summary>
    private CovariateSet Part(DesignBlock block)
    {
        reader.Open(block);
        var offered = new bool[block.Situations * J];
        var chosen = new int[block.Situations];
        for (var lane = 0; lane < block.Situations; lane++)
        {
            chosen[lane] = reader.ChosenAt(lane);
            for (var j = 0; j < J; j++) offered[(lane * J) + j] = reader.IsOffered(lane, j);
        }

        var firstPerson = main.PersonOf[block.FirstSituation];
        var persons = main.PersonOf[block.FirstSituation + block.Situations - 1] + 1 - firstPerson;
        var starts = new int[persons + 1];
        var personOf = new int[block.Situations];
        for (var p = 0; p <= persons; p++) starts[p] = main.PersonStart[firstPerson + p] - block.FirstSituation;
        for (var p = 0; p < persons; p++) personOf.AsSpan(starts[p]..starts[p + 1]).Fill(p);

        ImmutableArray<Covariate> filled =
            [.. covariates.Select(c => c.Head.IsConstant ? c.Head : c.Head with { Values = ImmutableCollectionsMarshal.AsImmutableArray(Fill(c, block, offered, starts)) })];
        var panel = new ChoicePanel(
            NoTable, [.. Enumerable.Repeat("", persons)], main.Tree.Alternatives, [.. starts], [.. personOf], [], [], [.. offered], [.. chosen],
            main.PersonWeight[firstPerson..(firstPerson + persons)], main.ClusterBy, main.Clusters, main.ClusterOf[firstPerson..(firstPerson + persons)]);
        return new CovariateSet(panel, [.. Enumerable.Range(0, block.Situations)], filled, [], [], []);
    }

    private double[] Fill(Derived covariate, DesignBlock block, bool[] offered, int[] starts)
    {
        var enters = covariate.Head.Enters;
        var values = new double[block.Situations * enters.Length];
        foreach (var column in main.Columns)
        {
            if (column.Parameter != covariate.From) continue;
            var place = enters.IndexOf(column.Alternative);
            for (var lane = 0; lane < block.Situations; lane++) values[(lane * enters.Length) + place] = reader.Value(column.Storage, lane);
        }

        if (!covariate.IsMean) return values;
        for (var p = 0; p + 1 < starts.Length; p++)
            for (var place = 0; place < enters.Length; place++)
            {
                var (sum, count) = (0.0, 0);
                for (var lane = starts[p]; lane < starts[p + 1]; lane++)
                {
                    if (!offered[(lane * J) + enters[place]] || (isWithoutFirst && sample.Times.Record[block.FirstSituation + lane] == 0)) continue;
                    sum += values[(lane * enters.Length) + place];
                    count++;
                }

                // An alternative that was offered at the first recorded occasion alone has no mean; 0 stands there.
                var mean = count > 0 ? sum / count : 0;
                for (var lane = starts[p]; lane < starts[p + 1]; lane++)
                    values[(lane * enters.Length) + place] = offered[(lane * J) + enters[place]] ? mean : 0;
            }

        return values;
    }

    /// <summary>Whether the covariates of a mean term give all offered alternatives the same value wherever it looks.</summary>
    private sealed class CommonValue(Derived[] own, int alternatives)
    {
        private readonly bool isForAll = own.Sum(c => c.Head.Enters.Length) == alternatives;
        private bool isSame = true;
        private bool hasValue;

        public bool Cancels => isForAll && isSame && hasValue;

        public void Look(CovariateSet part, ImmutableArray<Derived> all)
        {
            if (!isForAll || !isSame) return;
            var values = own.Select(c => part.Covariates[all.IndexOf(c)]).ToArray();
            for (var t = 0; t < part.Used.Length; t++)
            {
                var first = double.NaN;
                foreach (var covariate in values)
                    for (var place = 0; place < covariate.Enters.Length; place++)
                    {
                        if (!part.Panel.Offered[(t * alternatives) + covariate.Enters[place]]) continue;
                        var x = covariate.Values[(t * covariate.Enters.Length) + place];
                        hasValue |= x != 0;
                        if (double.IsNaN(first)) first = x;
                        else isSame &= x == first;
                    }
            }
        }
    }
}
