namespace PanelChoice.Study;

/// <summary>Reads <c>[history]</c>, <c>[estimate]</c>, <c>[inference]</c> with its bootstrap, and <c>[diagnostics]</c>; an absent table has its defaults.</summary>
internal static class SettingsSections
{
    // Beyond these a figure gains no digit; the run only never ends, or asks for memory without end.
    private const int MostStarts = 100_000;
    private const int MostLags = 1_000;
    private const int MostDraws = 10_000_000;

    private const string BelowOne = "a number between 0 and 1, both excluded";

    public static HistorySpecification History(TableReader table, StudyProblems problems)
    {
        var previous = table.Word<PreviousRule?>(
            "previous", null, ("recorded", PreviousRule.Recorded), ("step", PreviousRule.Step), ("day", PreviousRule.Day),
            ("workday", PreviousRule.Workday), ("week", PreviousRule.Week));
        var holidays = table.Dates("holidays");
        var longestGap = table.Whole("longest_gap", 1);
        var without = table.Word("without_history", MissingHistory.Drop, ("drop", MissingHistory.Drop), ("zero", MissingHistory.Zero));
        Belongs("holidays", PreviousRule.Workday, "workday");
        Belongs("longest_gap", PreviousRule.Recorded, "recorded");
        return new HistorySpecification(previous, holidays, longestGap, without);

        void Belongs(string key, PreviousRule rule, string word)
        {
            // Where 'previous' itself has a problem, nothing can be said about what goes with it.
            if (table.Has(key) && previous != rule && (previous is not null || !table.Has("previous")))
                problems.Add("study.needs_key", table.PlaceOf(key), $"'{key}' has a meaning only with previous = \"{word}\"", $"write previous = \"{word}\" or remove '{key}'");
        }
    }

    public static EstimateSettings Estimate(TableReader table) => new(
        table.Word("form", NestedLogitForm.UtilityScaled, ("utility-scaled", NestedLogitForm.UtilityScaled), ("unscaled", NestedLogitForm.Unscaled)),
        table.Whole("starts", 1, MostStarts) ?? 20,
        table.Seed("seed", 7));

    public static InferenceSettings Inference(TableReader table, TableReader bootstrap, StudyProblems problems)
    {
        var cluster = table.Text("cluster") ?? "person";
        var second = table.Text("second_cluster");
        var confidence = table.Number("confidence", InsideUnit, BelowOne) ?? 0.95;
        var jackknife = table.Word(
            "jackknife", JackknifeKind.Auto, ("auto", JackknifeKind.Auto), ("refit", JackknifeKind.Refit), ("one_step", JackknifeKind.OneStep), ("off", JackknifeKind.Off));
        var sampling = BootstrapSection.Read(bootstrap, problems);
        return new InferenceSettings(cluster, confidence, jackknife, sampling.Replicates, bootstrap.Seed("seed", 7))
        {
            SecondCluster = second,
            ScoreDraws = table.Whole("score_draws", 0, MostDraws),
            Draw = sampling.Draw,
            Blocks = sampling.Blocks,
            BlockLength = sampling.Length,
            Target = sampling.Target,
            Studentised = bootstrap.OptionalFlag("studentised"),
        };
    }

    public static DiagnosticsSettings Diagnostics(TableReader table) => new(
        table.Whole("lags", 1, MostLags) ?? 5,
        table.Number("level", InsideUnit, BelowOne) ?? 0.05,
        table.Whole("draws", 1, MostDraws) ?? 9999,
        table.Seed("seed", 7));

    private static bool InsideUnit(double value) => value is > 0 and < 1;
}
