using System.Collections.Immutable;
using PanelChoice.Study;

namespace PanelChoice.Panels;

/// <summary>Smallest, middle and largest of some counts.</summary>
/// <param name="Smallest">The smallest.</param>
/// <param name="Median">The middle one; the mean of the two middle ones of an even number.</param>
/// <param name="Largest">The largest.</param>
public sealed record Spread(int Smallest, double Median, int Largest)
{
    /// <summary>The spread of one or more counts.</summary>
    /// <exception cref="ArgumentException">There are none.</exception>
    public static Spread Of(IEnumerable<int> counts)
    {
        var sorted = counts.Order().ToArray();
        if (sorted.Length == 0) throw new ArgumentException("A spread needs at least one count.", nameof(counts));
        return new Spread(sorted[0], (sorted[(sorted.Length - 1) / 2] + sorted[sorted.Length / 2]) / 2.0, sorted[^1]);
    }
}

/// <summary>Where records are missing between two recorded occasions of a person.</summary>
/// <param name="Unit">Unit of the study's history rule where it measures time, otherwise the unit that the occasions suggest.</param>
/// <param name="Step">Number of units between two occasions without a gap (a survey every second year: 2).</param>
/// <param name="Count">Number of gaps.</param>
/// <param name="PersonsWithGaps">Number of persons with a gap.</param>
/// <param name="Longest">Longest distance between neighbouring records, in units (a part of a week counts whole); 0 when nobody has two.</param>
public sealed record GapProfile(OccasionUnit Unit, long Step, int Count, int PersonsWithGaps, long Longest);

/// <summary>How often an alternative is offered and chosen; every occasion counts once, whatever its weight.</summary>
/// <param name="Name">Name of the alternative.</param>
/// <param name="Offered">Occasions on which it is offered.</param>
/// <param name="OfferedShare">Share of all occasions on which it is offered.</param>
/// <param name="Chosen">Occasions on which it is chosen.</param>
/// <param name="ChosenShare">Share of all occasions on which it is chosen.</param>
/// <param name="ChosenWhereOffered">Share of the occasions on which it is offered; null when it never is.</param>
/// <param name="PersonsChoosing">Persons who choose it at least once.</param>
public sealed record AlternativeProfile(
    string Name, int Offered, double OfferedShare, int Chosen, double ChosenShare, double? ChosenWhereOffered, int PersonsChoosing);

/// <summary>What happens after the last choice, over all occasions that have a previous one by the study's rule (the recorded one where none is stated).</summary>
/// <param name="Rule">The rule.</param>
/// <param name="Occasions">Occasions with a previous one.</param>
/// <param name="Repeated">Occasions on which the previous choice is made again.</param>
/// <param name="RepeatedShare">Their share; null when no occasion has a previous one.</param>
/// <param name="NotOfferedNow">Occasions on which the previously chosen alternative is not offered.</param>
/// <param name="Transitions">J x J counts: row by the previous choice, column by the present one, both in the panel's order of alternatives.</param>
public sealed record LastChoiceProfile(
    PreviousRule Rule, int Occasions, int Repeated, double? RepeatedShare, int NotOfferedNow, ImmutableArray<ImmutableArray<int>> Transitions);

/// <summary>The sampling weights.</summary>
/// <param name="Column">Column of the weight.</param>
/// <param name="Smallest">Smallest weight of a person.</param>
/// <param name="Mean">Mean over persons.</param>
/// <param name="Largest">Largest weight of a person.</param>
public sealed record WeightProfile(string Column, double Smallest, double Mean, double Largest);

/// <summary>The clusters.</summary>
/// <param name="By">"person", or the cluster column's name.</param>
/// <param name="Count">Number of clusters.</param>
/// <param name="Occasions">Occasions in a cluster.</param>
public sealed record ClusterProfile(string By, int Count, Spread Occasions);

/// <summary>Who is in a panel, for how long, with which gaps, and who ever switches: what an analyst must know before a model.</summary>
/// <param name="File">Data file as the study writes it.</param>
/// <param name="Rows">Rows read.</param>
/// <param name="Persons">Number of persons.</param>
/// <param name="Occasions">Number of occasions over all persons.</param>
/// <param name="FirstOccasion">Earliest occasion as the file writes it (dates by ISO 8601); null without an occasion column.</param>
/// <param name="LastOccasion">Latest occasion; null without an occasion column.</param>
/// <param name="OccasionsPerPerson">Recorded occasions of a person.</param>
/// <param name="Gaps">Gaps between them; null without an occasion column.</param>
/// <param name="Alternatives">Each alternative, in the panel's order.</param>
/// <param name="OfferedAlternatives">Alternatives offered on an occasion.</param>
/// <param name="SingleAlternativeOccasions">Occasions that offer one alternative only: they serve as history and contribute nothing else.</param>
/// <param name="LastChoice">Repeated choices and transitions; null without an occasion column.</param>
/// <param name="PersonsWithSeveralOccasions">Persons with two or more recorded occasions.</param>
/// <param name="PersonsNeverSwitching">Those among them who choose the same alternative every time.</param>
/// <param name="Weights">The weights; null without a weight column.</param>
/// <param name="Clusters">The clusters.</param>
/// <param name="Cautions">What an analyst should look at before going on.</param>
public sealed record PanelProfile(
    string File, int Rows, int Persons, int Occasions, string? FirstOccasion, string? LastOccasion, Spread OccasionsPerPerson, GapProfile? Gaps,
    ImmutableArray<AlternativeProfile> Alternatives, Spread OfferedAlternatives, int SingleAlternativeOccasions, LastChoiceProfile? LastChoice,
    int PersonsWithSeveralOccasions, int PersonsNeverSwitching, WeightProfile? Weights, ClusterProfile Clusters, ImmutableArray<Caution> Cautions)
{
    /// <summary>Profiles a panel. All counts are of the recorded panel, before any occasion leaves the estimation sample.</summary>
    /// <param name="study">The study.</param>
    /// <param name="panel">The panel built for it.</param>
    public static PanelProfile Of(StudySpecification study, ChoicePanel panel)
    {
        ArgumentNullException.ThrowIfNull(study);
        ArgumentNullException.ThrowIfNull(panel);
        return new PanelProfiler(study, panel).Profile();
    }
}
