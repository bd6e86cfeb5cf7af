using PanelChoice.Study;

namespace PanelChoice.Cli;

/// <summary>Reads a study and goes on with it, or tells every problem in a line of its own.</summary>
internal static class StudyRun
{
    /// <summary>Reads the study and hands it on.</summary>
    /// <param name="path">The study file.</param>
    /// <param name="options">Where to write.</param>
    /// <param name="next">What to do with the study; gives a record or problems.</param>
    /// <param name="done">What to do with the record; gives the exit code.</param>
    public static int With<T>(string path, RunOptions options, Func<StudySpecification, Checked<T>> next, Func<StudySpecification, T, int> done)
        where T : class
    {
        var study = StudyFileReader.Read(path);
        if (study.Value is not { } specification) return Reject(options, study.Problems);
        var outcome = next(specification);
        return outcome.Value is { } value ? done(specification, value) : Reject(options, outcome.Problems);
    }

    /// <summary>Tells every problem; something that is not there has a code of its own, unless something else is wrong besides.</summary>
    public static int Reject(RunOptions options, IReadOnlyCollection<Problem> problems)
    {
        foreach (var problem in problems) options.Terminal.Problem(problem.Sentence);
        if (problems.All(p => p.Id == "store.little_memory")) return ExitCode.Usage;
        return problems.All(p => p.Id is "study.not_found" or "data.not_found" or "parts.not_found" or "parts.missing") ? ExitCode.NotFound : ExitCode.Rejected;
    }
}
