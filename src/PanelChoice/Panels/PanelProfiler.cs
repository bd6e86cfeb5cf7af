using System.Collections.Immutable;
using PanelChoice.Data;
using PanelChoice.Study;

namespace PanelChoice.Panels;

/// <summary>Counts what a panel's profile says.</summary>
internal sealed class PanelProfiler(StudySpecification study, ChoicePanel panel)
{
    private readonly int alternatives = panel.Alternatives.Length;

    public PanelProfile Profile()
    {
        var kind = panel.Table.OccasionKind;
        var hasOccasions = kind != OccasionKind.None;
        var lengths = Enumerable.Range(0, panel.Persons.Length).Select(p => panel.PersonStart[p + 1] - panel.PersonStart[p]).ToArray();
        var widths = Enumerable.Range(0, panel.Occasions).Select(panel.OfferedAt).ToArray();
        var profile = new PanelProfile(
            panel.Table.File, panel.Table.Rows, panel.Persons.Length, panel.Occasions,
            hasOccasions ? OccasionName.Of(kind, panel.Occasion.Min()) : null,
            hasOccasions ? OccasionName.Of(kind, panel.Occasion.Max()) : null,
            Spread.Of(lengths),
            hasOccasions ? Gaps() : null,
            Alternatives(),
            Spread.Of(widths),
            widths.Count(w => w == 1),
            hasOccasions ? LastChoices() : null,
            lengths.Count(n => n > 1),
            Enumerable.Range(0, panel.Persons.Length).Count(NeverSwitches),
            panel.IsWeighted ? new WeightProfile(study.Panel.Weight!, panel.Weight.Min(), panel.Weight.Average(), panel.Weight.Max()) : null,
            new ClusterProfile(
                panel.ClusterBy, panel.Clusters.Length, Spread.Of(lengths.Select((n, p) => (n, p)).GroupBy(x => panel.ClusterOf[x.p], x => x.n).Select(c => c.Sum()))),
            []);
        return profile with { Cautions = ProfileCautions.Of(study, panel, profile) };
    }

    private GapProfile Gaps()
    {
        var axis = OccasionAxis.Of(panel, study.History);
        var (count, persons, longest) = (0, 0, 0L);
        for (var p = 0; p < panel.Persons.Length; p++)
        {
            var before = OccasionAxis.Off;
            var own = 0;
            for (var o = panel.PersonStart[p]; o < panel.PersonStart[p + 1]; o++)
            {
                var here = axis.Position[o];
                if (here == OccasionAxis.Off) continue;
                if (before != OccasionAxis.Off)
                {
                    longest = Math.Max(longest, here - before);
                    if (here - before > axis.Step) own++;
                }

                before = here;
            }

            count += own;
            if (own > 0) persons++;
        }

        // Positions count days, also where the unit is a week.
        var perUnit = axis.Unit == OccasionUnit.Week ? 7 : 1;
        return new GapProfile(axis.Unit, axis.Step / perUnit, count, persons, (longest + perUnit - 1) / perUnit);
    }

    private ImmutableArray<AlternativeProfile> Alternatives()
    {
        var offered = new int[alternatives];
        var chosen = new int[alternatives];
        var choosing = new HashSet<int>[alternatives];
        for (var j = 0; j < alternatives; j++) choosing[j] = [];
        for (var o = 0; o < panel.Occasions; o++)
        {
            for (var j = 0; j < alternatives; j++) if (panel.Offered[(o * alternatives) + j]) offered[j]++;
            chosen[panel.Chosen[o]]++;
            choosing[panel.Chosen[o]].Add(panel.PersonOf[o]);
        }

        double all = panel.Occasions;
        return [.. panel.Alternatives.Select((name, j) => new AlternativeProfile(
            name, offered[j], offered[j] / all, chosen[j], chosen[j] / all, offered[j] > 0 ? (double)chosen[j] / offered[j] : null, choosing[j].Count))];
    }

    private LastChoiceProfile LastChoices()
    {
        var previous = new OccasionHistory(panel, study.History).Back(1);
        var transitions = new int[alternatives, alternatives];
        var (pairs, repeated, notOffered) = (0, 0, 0);
        for (var o = 0; o < panel.Occasions; o++)
        {
            if (previous[o] == OccasionHistory.None) continue;
            var last = panel.Chosen[previous[o]];
            pairs++;
            transitions[last, panel.Chosen[o]]++;
            if (last == panel.Chosen[o]) repeated++;
            if (!panel.Offered[(o * alternatives) + last]) notOffered++;
        }

        return new LastChoiceProfile(
            study.History.Previous ?? PreviousRule.Recorded, pairs, repeated, pairs > 0 ? (double)repeated / pairs : null, notOffered,
            [.. Enumerable.Range(0, alternatives).Select(i => Enumerable.Range(0, alternatives).Select(j => transitions[i, j]).ToImmutableArray())]);
    }

    private bool NeverSwitches(int person)
    {
        var (from, to) = (panel.PersonStart[person], panel.PersonStart[person + 1]);
        for (var o = from + 1; o < to; o++) if (panel.Chosen[o] != panel.Chosen[from]) return false;
        return to - from > 1;
    }
}
