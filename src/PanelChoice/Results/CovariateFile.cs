using PanelChoice.Covariates;

namespace PanelChoice.Results;

/// <summary>
/// The built covariates as a table: a row for each recorded row of the estimation sample, by person, occasion and alternative, and a column for
/// each coefficient, under the coefficient's label. A covariate is 0 on alternatives it does not enter and where the alternative was not offered.
/// </summary>
public static class CovariateFile
{
    /// <summary>Whether the name ends in one of the two forms that can be written, .csv and .parquet.</summary>
    public static bool CanWrite(string path) => IsCsv(path) || IsParquet(path);

    /// <summary>Writes the table, whole or not at all.</summary>
    /// <param name="covariates">The covariates.</param>
    /// <param name="path">The file to make or replace; .csv (UTF-8, LF, decimal points, ISO dates, round-trip digits) or .parquet (Snappy).</param>
    /// <exception cref="ArgumentException">The name ends in neither .csv nor .parquet.</exception>
    /// <exception cref="IOException">The file cannot be written.</exception>
    /// <exception cref="UnauthorizedAccessException">The file may not be written.</exception>
    public static void Write(CovariateSet covariates, string path)
    {
        ArgumentNullException.ThrowIfNull(covariates);
        ArgumentNullException.ThrowIfNull(path);
        if (!CanWrite(path)) throw new ArgumentException($"'{path}' ends in neither .csv nor .parquet.", nameof(path));
        var table = new CovariateTable(covariates);
        AtomicFile.Write(path, stream =>
        {
            if (IsCsv(path)) CovariateCsv.Write(table, stream);
            else CovariateParquet.Write(table, stream);
        });
    }

    private static bool IsCsv(string path) => path.EndsWith(".csv", StringComparison.OrdinalIgnoreCase);

    private static bool IsParquet(string path) => path.EndsWith(".parquet", StringComparison.OrdinalIgnoreCase);
}
