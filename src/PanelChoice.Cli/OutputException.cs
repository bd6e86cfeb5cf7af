using PanelChoice.Study;

namespace PanelChoice.Cli;

/// <summary>An output file or folder cannot be written.</summary>
internal sealed class OutputException : Exception
{
    public OutputException(string path, Exception cause)
        : base($"'{path}' cannot be written: {cause.Message}", cause)
    {
    }

    /// <summary>Refuses a path under which the study or its data lie: results must not replace what they were made from.</summary>
    public static void RefuseInput(string path, StudySpecification study)
    {
        var full = Path.GetFullPath(path);
        if (IsAt(study.File)) throw new OutputException(path, new IOException("it is the study file; name another file."));
        if (IsAt(study.Panel.FullPath)) throw new OutputException(path, new IOException("it is the study's data file; name another file."));

        // Without regard to case, because on many systems two such names are one file.
        bool IsAt(string input) => string.Equals(full, Path.GetFullPath(input), StringComparison.OrdinalIgnoreCase);
    }

    /// <summary>Runs something that writes, and turns the system's refusal into this exception.</summary>
    public static void Guard(string path, Action write) => Guard(path, () =>
    {
        write();
        return true;
    });

    /// <summary>Runs something that writes and gives a value, and turns the system's refusal into this exception.</summary>
    public static T Guard<T>(string path, Func<T> write)
    {
        try
        {
            return write();
        }
        catch (Exception refused) when (refused is IOException or UnauthorizedAccessException or ArgumentException { ParamName: "path" } or NotSupportedException)
        {
            throw new OutputException(path, refused);
        }
    }
}
