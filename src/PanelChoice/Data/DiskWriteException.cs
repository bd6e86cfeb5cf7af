namespace PanelChoice.Data;

/// <summary>A file that is being made could not be written; told apart from what goes wrong with the data file, which is being read at the same time.</summary>
internal sealed class DiskWriteException(Exception cause) : Exception(cause.Message, cause)
{
    /// <summary>Runs something that writes, and turns the system's refusal into this exception.</summary>
    public static T Guard<T>(Func<T> write)
    {
        try
        {
            return write();
        }
        catch (Exception e) when (e is IOException or UnauthorizedAccessException)
        {
            throw new DiskWriteException(e);
        }
    }
}
