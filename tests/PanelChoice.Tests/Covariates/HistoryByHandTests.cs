using FsCheck.Xunit;
using PanelChoice.Numerics;
using PanelChoice.Panels;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Covariates;

/// <summary>Every rule against a search that walks the calendar day by day, on random diaries.</summary>
public class HistoryByHandTests
{
    private static readonly DateOnly Start = new(2028, 2, 18);

    [Property(MaxTest = 60)]
    public void The_kth_previous_and_next_are_what_walking_day_by_day_finds(int seed)
    {
        var random = new CounterRandom(seed, "history by hand", 0);
        var lines = new List<string>();
        for (var p = 0; p < 3; p++)
            for (var d = 0; d < 40; d++)
                if (random.NextDouble() < 0.7) lines.Add($"p{p} {Start.AddDays(d):yyyy-MM-dd} {(random.Next(2) == 0 ? "bus" : "tram")}");
        var shuffled = lines.ToArray();
        random.Shuffle(shuffled);
        var panel = Diary.Panel("bus tram", string.Join('\n', shuffled));
        DateOnly[] holidays = [.. Enumerable.Range(0, 4).Select(_ => Start.AddDays(random.Next(40)))];
        foreach (var rule in new[] { PreviousRule.Recorded, PreviousRule.Day, PreviousRule.Workday, PreviousRule.Week })
        {
            int? longest = rule == PreviousRule.Recorded && random.Next(2) == 0 ? 1 + random.Next(6) : null;
            var history = new OccasionHistory(panel, new HistorySpecification(rule, [.. holidays], longest, MissingHistory.Drop));
            for (var k = 1; k <= 3; k++)
            {
                var (back, ahead) = (history.Back(k), history.Ahead(k));
                for (var o = 0; o < panel.Occasions; o++)
                {
                    Assert.Equal(Walk(panel, o, -k, rule, holidays, longest), back[o]);
                    Assert.Equal(Walk(panel, o, k, rule, holidays, null), ahead[o]);
                }
            }
        }
    }

    /// <summary>Index of the occasion a number of steps away, or -1, found the slow way.</summary>
    private static int Walk(ChoicePanel panel, int occasion, int by, PreviousRule rule, DateOnly[] holidays, int? longest)
    {
        bool IsOff(DateOnly d) => d.DayOfWeek is DayOfWeek.Saturday or DayOfWeek.Sunday || holidays.Contains(d);
        int Find(DateOnly d) => Enumerable.Range(0, panel.Occasions)
            .FirstOrDefault(o => panel.PersonOf[o] == panel.PersonOf[occasion] && panel.Occasion[o] == d.DayNumber, -1);
        var date = DateOnly.FromDayNumber((int)panel.Occasion[occasion]);
        if (rule == PreviousRule.Workday && IsOff(date)) return -1;
        var from = date;
        var step = Math.Sign(by);
        for (var left = Math.Abs(by); left > 0;)
        {
            date = date.AddDays(step);
            if (Math.Abs(date.DayNumber - from.DayNumber) > 60) return -1;
            left -= rule switch
            {
                PreviousRule.Day => 1,
                PreviousRule.Workday => IsOff(date) ? 0 : 1,
                PreviousRule.Week => Math.Abs(date.DayNumber - from.DayNumber) % 7 == 0 ? 1 : 0,
                _ => Find(date) >= 0 ? 1 : 0,
            };
        }

        return longest is { } most && from.DayNumber - date.DayNumber > most ? -1 : Find(date);
    }
}
