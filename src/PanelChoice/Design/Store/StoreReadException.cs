using PanelChoice.Study;

namespace PanelChoice.Design.Store;

/// <summary>
/// Blocks of a store could not be read while they were in use. It passes through a likelihood, whose signature knows no files, and becomes a problem where a
/// run as a whole is told.
/// </summary>
internal sealed class StoreReadException(Exception cause) : Exception(cause.Message, cause)
{
    /// <summary>Runs something that reads a store, and turns such a failure into its problem, <c>store.unreadable</c>.</summary>
    /// <typeparam name="T">What it gives.</typeparam>
    /// <param name="store">The store's file; null where the design is in memory.</param>
    /// <param name="use">What to run.</param>
    public static Checked<T> Guard<T>(string? store, Func<Checked<T>> use)
        where T : class
    {
        try
        {
            return use();
        }
        catch (Exception e) when (store is not null && In(e) is not null)
        {
            return Checked<T>.Bad([new Problem(
                "store.unreadable", store, $"the store cannot be read any more ({In(e)!.Message.TrimEnd('.')}), so the run was given up and no result written",
                "check the disk and what else writes to the file, delete the store, and run the same command again")]);
        }
    }

    /// <summary>The failure in what a thread, or several, ended with.</summary>
    private static StoreReadException? In(Exception thrown) => thrown switch
    {
        StoreReadException found => found,
        AggregateException several => several.InnerExceptions.Select(In).FirstOrDefault(e => e is not null),
        { InnerException: { } inner } => In(inner),
        _ => null,
    };
}
