using System.Collections.Immutable;
using PanelChoice.Data;
using PanelChoice.Numerics;
using PanelChoice.Panels;

namespace PanelChoice.Covariates;

/// <summary>When the situations of a sample took place, and what the recorded panel says about the distances between occasions; in few bytes a situation.</summary>
internal sealed class SituationTimes
{
    private SituationTimes(CompactNumbers occasion, CompactNumbers record, bool areWorkdays, bool areMostlyApart)
    {
        Occasion = occasion;
        Record = record;
        AreWorkdays = areWorkdays;
        AreMostlyApart = areMostlyApart;
    }

    /// <summary>Whole number or day number of each situation's occasion.</summary>
    public CompactNumbers Occasion { get; }

    /// <summary>Number of recorded occasions of the person before each situation.</summary>
    public CompactNumbers Record { get; }

    /// <summary>Whether occasions are dates, none of which is a Saturday or Sunday.</summary>
    public bool AreWorkdays { get; }

    /// <summary>Whether the median distance of a person's neighbouring records is above 1, in working days where all are, else in days or units.</summary>
    public bool AreMostlyApart { get; }

    /// <summary>The times of no situation.</summary>
    public static SituationTimes None { get; } = new Builder().Finish();

    /// <summary>The times of a sample that is one part.</summary>
    public static SituationTimes Of(ChoicePanel panel, ImmutableArray<int> used)
    {
        var builder = new Builder();
        builder.Add(panel, used);
        return builder.Finish();
    }

    /// <summary>Writes them.</summary>
    public void Write(BinaryWriter to)
    {
        to.Write(AreWorkdays);
        to.Write(AreMostlyApart);
        Occasion.Write(to);
        Record.Write(to);
    }

    /// <summary>Reads what <see cref="Write"/> wrote.</summary>
    public static SituationTimes Read(BinaryReader from)
    {
        var (areWorkdays, areMostlyApart) = (from.ReadBoolean(), from.ReadBoolean());
        return new SituationTimes(CompactNumbers.Read(from), CompactNumbers.Read(from), areWorkdays, areMostlyApart);
    }

    /// <summary>Takes a panel part by part.</summary>
    public sealed class Builder
    {
        private readonly CompactNumbers.Builder occasion = new();
        private readonly CompactNumbers.Builder record = new();
        private readonly WorkingCalendar calendar = new([]);
        private bool areWorkdays = true;
        private long distances;
        private long nearInWorkdays;
        private long near;

        /// <summary>Adds the next part.</summary>
        public void Add(ChoicePanel panel, ImmutableArray<int> used)
        {
            areWorkdays = areWorkdays && panel.Table.OccasionKind == OccasionKind.Date && panel.Occasion.All(calendar.IsWorkingDay);
            for (var o = 1; o < panel.Occasions; o++)
            {
                if (panel.PersonOf[o] != panel.PersonOf[o - 1]) continue;
                distances++;
                if (panel.Occasion[o] - panel.Occasion[o - 1] <= 1) near++;
                if (areWorkdays && calendar.Number(panel.Occasion[o]) - calendar.Number(panel.Occasion[o - 1]) <= 1) nearInWorkdays++;
            }

            foreach (var o in used)
            {
                occasion.Add(panel.Occasion[o]);
                record.Add(o - panel.PersonStart[panel.PersonOf[o]]);
            }
        }

        /// <summary>The times of all parts.</summary>
        public SituationTimes Finish() =>
            // Distances are 1 or more: their median is above 1 unless the upper of the two in the middle is 1.
            new(occasion.Finish(), record.Finish(), areWorkdays, distances > 0 && (areWorkdays ? nearInWorkdays : near) <= distances / 2);
    }
}
