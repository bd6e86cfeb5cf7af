using System.Collections.Immutable;
using System.Globalization;
using PanelChoice.Data;
using PanelChoice.Study;

namespace PanelChoice.Panels;

/// <summary>What in a panel is legitimate, but should be looked at before a model is built on it.</summary>
internal static class ProfileCautions
{
    /// <summary>The cautions of a profile, in the order in which it is read.</summary>
    public static ImmutableArray<Caution> Of(StudySpecification study, ChoicePanel panel, PanelProfile profile)
    {
        var cautions = ImmutableArray.CreateBuilder<Caution>();
        if (profile.PersonsWithSeveralOccasions == 0)
            Add("panel.one_occasion", $"Every person has one occasion: nothing can be said about habit or about dependence over time.");
        if (LooksLikeDates(panel))
            Add("panel.numbers_like_dates", $"The occasions are whole numbers that read like dates ({profile.FirstOccasion}): written so, the last day of a month and the next are far apart; write them as yyyy-mm-dd.");
        if (study.History.Previous == PreviousRule.Workday && NotWorkingDays(study, panel) is var days and > 0)
            Add("panel.not_working_days", $"{days:N0} of {profile.Occasions:N0} occasions are dated on a week-end or a holiday: under previous = \"workday\" they leave the sample and are nobody's history.");
        foreach (var alternative in profile.Alternatives)
        {
            if (alternative.Offered == 0)
                Add("panel.never_offered", $"'{alternative.Name}' is in the data but never offered: nothing can be learnt about it.");
            else if (alternative.Chosen == 0)
                Add("panel.never_chosen", $"'{alternative.Name}' is never chosen: a constant of its own has no finite estimate.");
        }

        foreach (var alike in panel.Alternatives.GroupBy(name => name, StringComparer.OrdinalIgnoreCase).Where(names => names.Count() > 1))
            Add("panel.names_alike", $"{string.Join(" and ", alike.Select(n => $"'{n}'"))} differ only in capital letters and count as different alternatives.");
        if (profile.SingleAlternativeOccasions > 0)
            Add("panel.single_alternative", $"{profile.SingleAlternativeOccasions:N0} of {profile.Occasions:N0} occasions offer one alternative only: they serve as history and say nothing about preference.");
        if (profile.LastChoice is { Occasions: 0 } && profile.PersonsWithSeveralOccasions > 0)
            Add("panel.no_previous", $"No occasion has a previous one by the study's rule (previous = \"{profile.LastChoice.Rule.ToString().ToLowerInvariant()}\"): no term can look back.");
        if (profile.PersonsWithSeveralOccasions > 0 && profile.PersonsNeverSwitching == profile.PersonsWithSeveralOccasions)
            Add("panel.nobody_switches", $"Nobody ever switches: habit and lasting taste cannot be told apart.");
        if (profile.Clusters.Count == 1)
            Add("panel.one_cluster", $"All persons are in one cluster of '{profile.Clusters.By}': no clustered standard error exists.");
        return cautions.ToImmutable();

        void Add(string id, FormattableString sentence) => cautions.Add(new Caution(id, sentence.ToString(CultureInfo.InvariantCulture)));
    }

    private static int NotWorkingDays(StudySpecification study, ChoicePanel panel)
    {
        var calendar = new WorkingCalendar(study.History.Holidays);
        return panel.Occasion.Count(day => !calendar.IsWorkingDay(day));
    }

    private static bool LooksLikeDates(ChoicePanel panel) => panel.Table.OccasionKind == OccasionKind.WholeNumber && panel.Occasion.All(o =>
        o is >= 19000101 and <= 21991231 && o / 100 % 100 is var month and >= 1 and <= 12 && o % 100 >= 1 && o % 100 <= DateTime.DaysInMonth((int)(o / 10000), (int)month));
}
