namespace PanelChoice.Simulation;

/// <summary>The study files of the demonstration, with comments that teach.</summary>
internal static class DemoStudy
{
    /// <summary>The panel with lasting tastes and habit.</summary>
    public static string Habit { get; } = Text(
        "Marrowick crossing: commuters with habits", "marrowick-habit.csv",
        """
        # Marrowick is an invented town on an estuary; everybody works on the far bank. These 160 commuters
        # kept a diary for seven weeks. The panel was made with a habit (0.9 for yesterday's mode) AND with
        # lasting personal tastes that no column shows (standard deviation 0.9 for each mode), so that the
        # verdict on independence has something to find: the model below knows the habit, not the tastes.
        """);

    /// <summary>The panel without either.</summary>
    public static string Quiet { get; } = Text(
        "Marrowick crossing: commuters without habits", "marrowick-quiet.csv",
        """
        # The same town, people and days as in marrowick-habit, made without habit and without lasting
        # tastes. The model is the same too: its habit term should come out near 0, its pooled and
        # clustered standard errors should agree, and the verdict should stay quiet (one panel in twenty
        # like this one would alarm by chance: that is what a level of 0.05 means).
        """);

    private static string Text(string title, string file, string about) => $$"""
        {{about}}
        title = "{{title}}"

        [panel]
        file        = "{{file}}"
        person      = "commuter"
        occasion    = "day"                   # a date, so every term that looks back can follow the calendar
        alternative = "mode"
        chosen      = "taken"
        offered     = "running"               # 0 where a mode could not be taken: no car, wrong tide, no seat left

        [history]
        previous        = "workday"           # Friday is the day before Monday; an absence is a gap, not a yesterday
        holidays        = ["2031-04-14"]
        without_history = "drop"              # a day whose working day before was not recorded is left out,
                                              # but still is the history of the next one

        # Boats stand in for each other more readily than for road vehicles, and the other way round.
        [[nest]]
        name    = "river"
        members = ["ferry", "hydrofoil"]

        [[nest]]
        name    = "road"
        members = ["bus", "drive"]            # cycling is in no nest: it stands alone

        [[term]]
        name     = "constant"                 # what the columns do not say about a mode, compared with the bus
        constant = true
        each     = true
        base     = "bus"

        [[term]]
        name   = "journey time"               # minutes
        column = "minutes"

        [[term]]
        name   = "cost"                       # coins
        column = "cost"

        [[term]]
        name   = "last delay"                 # minutes that the same mode was late on the working day before
        column = "delay"
        lag    = 1

        [[term]]
        name         = "season ticket"        # a person's attribute: it can only act on some modes, never on all alike
        column       = "season_ticket"
        alternatives = ["ferry", "hydrofoil"]

        [[term]]
        name         = "rain"
        column       = "wet"
        alternatives = ["cycle"]

        [[term]]
        name        = "same as yesterday"     # habit: 1 for the mode chosen on the working day before
        last_choice = 1

        [estimate]
        starts = 8                            # nested logit can have several maxima: start from several points
        seed   = 7

        [inference]
        cluster    = "person"                 # one person's days are not independent evidence
        confidence = 0.95
        jackknife  = "auto"

        [inference.bootstrap]
        replicates = 299                      # whole persons are drawn, with all their days and lags
        seed       = 7

        [diagnostics]
        lags  = 5
        level = 0.05
        draws = 9999
        seed  = 7

        """;
}
