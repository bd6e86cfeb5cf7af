using System.Collections.Immutable;
using PanelChoice.Data;
using PanelChoice.Numerics;
using PanelChoice.Panels;
using PanelChoice.Study;

namespace PanelChoice.Covariates;

/// <summary>How often an alternative is offered and chosen in the sample.</summary>
/// <param name="Name">Name of the alternative.</param>
/// <param name="Offered">Used occasions on which it is offered.</param>
/// <param name="Chosen">Used occasions on which it is chosen.</param>
public sealed record SampleAlternative(string Name, int Offered, int Chosen);

/// <summary>
/// What later stages know of the recorded panel, its sample and its covariates besides the design: counts and words. Nothing in it grows with the panel
/// but a few bytes for each situation, so that it stays when table, panel and covariates are gone.
/// </summary>
/// <param name="File">Data file as the study writes it.</param>
/// <param name="Sha256">Lower-case hexadecimal SHA-256 of its bytes.</param>
/// <param name="Rows">Rows read.</param>
/// <param name="RecordedPersons">Persons read.</param>
/// <param name="RecordedOccasions">Occasions read.</param>
/// <param name="OccasionKind">What occasions are.</param>
/// <param name="IsWeighted">Whether the study names a weight column.</param>
/// <param name="Persons">Persons in the sample.</param>
/// <param name="Occasions">Occasions in the sample.</param>
/// <param name="Alternatives">Each alternative, in the panel's order.</param>
/// <param name="Covariates">One for each coefficient, in order; their values may be missing.</param>
/// <param name="LeftOut">Occasions left out, by reason.</param>
/// <param name="StockStarts">Remaining weight of the start value, for each stock term.</param>
/// <param name="Cautions">Warnings that belong to the covariates.</param>
public sealed record EstimationSample(
    string File, string Sha256, long Rows, int RecordedPersons, int RecordedOccasions, OccasionKind OccasionKind, bool IsWeighted, int Persons, int Occasions,
    ImmutableArray<SampleAlternative> Alternatives, ImmutableArray<Covariate> Covariates, ImmutableArray<LeftOut> LeftOut,
    ImmutableArray<StockStart> StockStarts, ImmutableArray<Caution> Cautions)
{
    /// <summary>When the situations took place.</summary>
    internal SituationTimes Times { get; init; } = SituationTimes.None;

    /// <summary>Code of each situation in the column of the second grouping; null where the study names no such column.</summary>
    internal CompactNumbers? SecondCluster { get; init; }

    /// <summary>Whether an occasion is the same day for everybody: as the study states it, by default for dates only.</summary>
    internal bool SharesCalendar(StudySpecification study) => study.Panel.SharedCalendar ?? OccasionKind == OccasionKind.Date;

    /// <summary>The sample of covariates in memory.</summary>
    /// <param name="covariates">The covariates.</param>
    public static EstimationSample Of(CovariateSet covariates)
    {
        ArgumentNullException.ThrowIfNull(covariates);
        var builder = new Builder();
        builder.Add(covariates.Panel, covariates.Used);
        return builder.Finish(
            covariates.Panel.Table.File, covariates.Panel.Table.Sha256,
            new CovariateOutline(covariates.Covariates, [], covariates.LeftOut, covariates.StockStarts, covariates.Cautions));
    }

    /// <summary>Counts a panel and its sample part by part.</summary>
    internal sealed class Builder
    {
        private readonly SituationTimes.Builder times = new();
        private CompactNumbers.Builder? secondCluster;
        private long rows;
        private int recordedPersons;
        private int recordedOccasions;
        private int persons;
        private int occasions;
        private OccasionKind kind;
        private bool isWeighted;
        private ImmutableArray<string> names = [];
        private int[] offered = [];
        private int[] chosen = [];

        /// <summary>Number of used occasions so far.</summary>
        public int Occasions => occasions;

        /// <summary>Adds the next part.</summary>
        public void Add(ChoicePanel panel, ImmutableArray<int> used)
        {
            var alternatives = panel.Alternatives.Length;
            if (names.IsEmpty) (names, offered, chosen) = (panel.Alternatives, new int[alternatives], new int[alternatives]);
            (kind, isWeighted) = (panel.Table.OccasionKind, panel.IsWeighted);
            rows += panel.Table.Rows;
            recordedPersons += panel.Persons.Length;
            recordedOccasions += panel.Occasions;
            occasions += used.Length;
            for (var t = 0; t < used.Length; t++)
            {
                if (t == 0 || panel.PersonOf[used[t]] != panel.PersonOf[used[t - 1]]) persons++;
                chosen[panel.Chosen[used[t]]]++;
                for (var j = 0; j < alternatives; j++) if (panel.Offered[(used[t] * alternatives) + j]) offered[j]++;
            }

            times.Add(panel, used);
            if (panel.SecondCluster.IsEmpty) return;
            secondCluster ??= new CompactNumbers.Builder();
            foreach (var o in used) secondCluster.Add(panel.SecondCluster[o]);
        }

        /// <summary>The sample of all parts.</summary>
        public EstimationSample Finish(string file, string sha256, CovariateOutline outline) => new(
            file, sha256, rows, recordedPersons, recordedOccasions, kind, isWeighted, persons, occasions,
            [.. names.Select((name, j) => new SampleAlternative(name, offered[j], chosen[j]))],
            outline.Covariates, outline.LeftOut, outline.StockStarts, outline.Cautions)
        {
            Times = times.Finish(),
            SecondCluster = secondCluster?.Finish(),
        };
    }
}
