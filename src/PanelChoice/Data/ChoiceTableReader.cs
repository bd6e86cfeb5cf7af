using System.Security.Cryptography;
using PanelChoice.Study;

namespace PanelChoice.Data;

/// <summary>Reads the data file of a study: only the columns that the study needs, every cell checked.</summary>
public static class ChoiceTableReader
{
    /// <summary>Reads the panel's file; its ending says how: .csv, .tsv or .txt (text with a header row), .csv.gz (the same, gzip), .parquet.</summary>
    /// <param name="study">The study, which names the file and the columns.</param>
    /// <returns>
    /// The table, or the problems: <c>data.not_found</c>, <c>data.unreadable</c>, <c>data.unknown_format</c>, <c>data.empty_file</c>,
    /// <c>data.not_text</c>, <c>data.no_rows</c>, <c>data.missing_column</c>, <c>data.duplicate_column</c>, <c>data.unsupported_type</c>,
    /// <c>data.ragged_row</c>, <c>data.bad_quotes</c>, <c>data.not_utf8</c>, <c>data.empty_cell</c>, <c>data.not_a_number</c>,
    /// <c>data.not_finite</c>, <c>data.not_boolean</c>, <c>data.occasion_not_date_or_whole</c>, <c>data.mixed_occasions</c>,
    /// <c>data.occasion_out_of_range</c>, <c>data.too_long</c>.
    /// </returns>
    public static Checked<ChoiceTable> Read(StudySpecification study)
    {
        ArgumentNullException.ThrowIfNull(study);
        return Open(study, (file, read) =>
        {
            var sha256 = Convert.ToHexStringLower(SHA256.HashData(file));
            var columns = new ChoiceColumns(study);
            read(columns);
            return columns.Finish(sha256);
        });
    }

    /// <summary>Opens the panel's file for something that reads it, and turns what can go wrong with files into problems.</summary>
    /// <typeparam name="T">What is made of it.</typeparam>
    /// <param name="study">The study.</param>
    /// <param name="use">Gets the file, and what reads it from its beginning into columns.</param>
    internal static Checked<T> Open<T>(StudySpecification study, Func<FileStream, Action<ChoiceColumns>, Checked<T>> use)
        where T : class
    {
        var source = study.Panel;
        FileStream stream;
        try
        {
            stream = new FileStream(source.FullPath, FileMode.Open, FileAccess.Read, FileShare.Read, 1 << 16, FileOptions.SequentialScan);
        }
        catch (Exception e) when (e is FileNotFoundException or DirectoryNotFoundException)
        {
            return Bad("data.not_found", "there is no such file", $"check [panel] file; it was looked for at {source.FullPath}");
        }
        catch (Exception e) when (e is IOException or UnauthorizedAccessException)
        {
            var isFolder = Directory.Exists(source.FullPath);
            return Bad("data.unreadable", isFolder ? "this is a folder" : $"the file cannot be opened ({e.Message})", "name a file that can be read");
        }

        using (stream)
        {
            var read = ReaderFor(source.File);
            if (read is null)
                return Bad(
                    "data.unknown_format", "the ending of the name does not say how the file is written",
                    "give a .csv, .csv.gz, .tsv, .txt or .parquet file");
            try
            {
                if (stream.Length == 0) return Bad("data.empty_file", "the file is empty", "give a header row and the panel's rows");
                return use(stream, columns =>
                {
                    stream.Position = 0;
                    read(stream, source.File, columns);
                });
            }
            catch (IOException e)
            {
                return Bad("data.unreadable", $"the file cannot be read ({e.Message})", "check the disk, or copy the file again");
            }
        }

        Checked<T> Bad(string id, string what, string remedy) => Checked<T>.Bad([new Problem(id, source.File, what, remedy)]);
    }

    private static Action<Stream, string, ChoiceColumns>? ReaderFor(string file)
    {
        if (Ends(".csv.gz")) return CsvChoiceReader.ReadCompressed;
        if (Ends(".csv") || Ends(".tsv") || Ends(".txt")) return CsvChoiceReader.Read;
        return Ends(".parquet") ? ParquetChoiceReader.Read : null;

        bool Ends(string ending) => file.EndsWith(ending, StringComparison.OrdinalIgnoreCase);
    }
}
