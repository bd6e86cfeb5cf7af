namespace PanelChoice.Calibration;

/// <summary>Runs the cells of the interval study and prints their table.</summary>
internal static class IntervalStudy
{
    /// <summary>Runs it; 0, or 64 where a restart file belongs to another study.</summary>
    public static int Run(IntervalOptions options)
    {
        RestartFile file;
        try
        {
            file = new RestartFile(options.Restart, $"seed {options.Seed}, {options.Replicates} replicates, {IntervalScenario.Occasions} occasions");
        }
        catch (InvalidDataException wrong)
        {
            Console.Error.WriteLine(wrong.Message);
            return 64;
        }

        using (file)
        {
            foreach (var letter in options.Scenarios)
            {
                var scenario = IntervalScenario.Of(letter);
                Print(scenario, [.. options.Persons.Select(persons => (persons, Cell(scenario, persons, options, file)))]);
            }
        }

        return 0;
    }

    private static IntervalOutcome[] Cell(IntervalScenario scenario, int persons, IntervalOptions options, RestartFile file)
    {
        var outcomes = new IntervalOutcome[options.Panels];
        Parallel.For(0, options.Panels, new ParallelOptions { MaxDegreeOfParallelism = options.Threads }, i =>
        {
            if (file.Find(scenario.Letter, persons, i) is { } written)
            {
                outcomes[i] = IntervalOutcome.Parse(written);
                return;
            }

            outcomes[i] = IntervalOutcome.Of(scenario, persons, i, options);
            file.Keep(scenario.Letter, persons, i, outcomes[i].Written);
        });
        return outcomes;
    }

    private static void Print(IntervalScenario scenario, (int Persons, IntervalOutcome[] Outcomes)[] cells)
    {
        Console.WriteLine($"{scenario.Letter}: {scenario.Words}; percent of intervals that miss the value (nominal 5) +- Monte-Carlo error, of how many");
        Console.WriteLine($"{"",-20}{"",-20}{string.Concat(cells.Select(c => $"{$"{c.Persons} persons",-21}"))}");
        var kinds = cells.SelectMany(c => c.Outcomes).SelectMany(o => o.Verdicts.Keys).Distinct().Order(StringComparer.Ordinal).ToList();
        for (var term = 0; term < IntervalOutcome.Terms.Length; term++)
            foreach (var kind in kinds)
                Console.WriteLine($"{IntervalOutcome.Terms[term],-20}{kind,-20}{string.Concat(cells.Select(c => $"{Misses(c.Outcomes, kind, term),-21}"))}");
        Console.WriteLine($"{"fits with no maximum",-40}{string.Concat(cells.Select(c => $"{c.Outcomes.Count(o => o.Status != "Converged"),-21}"))}");
        Console.WriteLine();
    }

    private static string Misses(IntervalOutcome[] outcomes, string kind, int term)
    {
        var letters = outcomes.Select(o => o.Verdicts.TryGetValue(kind, out var v) ? v[term] : '-').Where(c => c != '-').ToList();
        if (letters.Count == 0) return "-";
        var share = letters.Count(c => c == 'm') / (double)letters.Count;
        return $"{100 * share:F1} +- {100 * Math.Sqrt(share * (1 - share) / letters.Count):F1} ({letters.Count})";
    }
}
