using System.Collections.Immutable;
using System.Globalization;
using CsvHelper;
using PanelChoice.Study;

namespace PanelChoice.Data;

/// <summary>
/// Reads a text file with a header row. The separator (comma, semicolon, tab or bar), a byte order mark and UTF-16 are detected. Rows are
/// numbered as a spreadsheet does: the header is row 1, an empty line is a row, a line break inside quotes is not.
/// </summary>
internal static class CsvChoiceReader
{
    /// <summary>A longer record is taken for a quote that was never closed.</summary>
    private const int LongestRecord = 1 << 24;

    /// <summary>Reads a plain file.</summary>
    public static void Read(Stream file, string name, ChoiceColumns columns) => Read(() => Rewound(file), name, columns);

    /// <summary>Reads a file packed with gzip.</summary>
    public static void ReadCompressed(Stream file, string name, ChoiceColumns columns)
    {
        try
        {
            var last = new GzipContent(Rewound(file));
            Read(() => last = new GzipContent(Rewound(file)), name, columns);
            if (last.IsAtEnd && !last.IsWhole())
                Unreadable("the file ends before its content does, or is several archives joined", "pack the whole panel again as one gzip file");
        }
        catch (InvalidDataException)
        {
            // What the runtime says here speaks of archives and is wrong as often as right.
            Unreadable("the file is not packed with gzip, or is damaged", "pack the panel again, or give the plain .csv file");
        }

        void Unreadable(string what, string remedy) => columns.Problems.Add(new Problem("data.unreadable", name, what, remedy));
    }

    private static Stream Rewound(Stream file)
    {
        file.Position = 0;
        return file;
    }

    private static void Read(Func<Stream> content, string name, ChoiceColumns columns)
    {
        if (HeaderOf(content, name, columns) is not { } header) return;
        var places = columns.Needed.Locate(name, header.Names, columns.Problems);
        if (columns.Problems.IsEmpty) ReadRows(content(), name, header, places, columns);
    }

    /// <summary>
    /// Finds the separator. The needed names are its best witness: when the header under the library's guess from the first lines does not
    /// show them all, the separator whose header shows the most of them is taken.
    /// </summary>
    private static Header? HeaderOf(Func<Stream> content, string name, ChoiceColumns columns)
    {
        var best = HeaderUnder(null, content(), columns);
        if (best is not null && best.Found < columns.Needed.All.Length)
            foreach (var separator in ",;\t|")
                if (HeaderUnder(separator, content(), columns) is { } other && other.Found > best.Found) best = other;

        if (best is null || Array.Exists(best.Names, n => n.Contains('\0', StringComparison.Ordinal)))
            columns.Problems.Add(new Problem("data.not_text", name, "the file does not begin with a header row of plain text", "save it as CSV in UTF-8"));
        else if (Array.TrueForAll(best.Names, n => n.Length == 0))
            columns.Problems.Add(new Problem("data.empty_file", name, "the first row is empty", "begin the file with a row of column names") { Row = 1 });
        else
            return best;
        return null;
    }

    private static Header? HeaderUnder(char? separator, Stream content, ChoiceColumns columns)
    {
        try
        {
            using var reader = CsvReader.Create(content, Options(separator), true);
            reader.ReadHeader();
            var names = reader.Headers.ToArray();
            for (var i = 0; i < names.Length; i++) names[i] = names[i].Trim();
            return new Header(separator, names, columns.Needed.All.Count(c => names.Contains(c.Name)));
        }
        catch (CsvFormatException)
        {
            return null;
        }
    }

    private static void ReadRows(Stream content, string name, Header header, ImmutableDictionary<string, int> places, ChoiceColumns columns)
    {
        var readings = columns.Readings.Select(r => (Field: places[r.Source], r.Into)).ToArray();
        CsvMalformedReason? malformed = null;
        using var reader = CsvReader.Create(content, Options(header.Separator) with { OnMalformedRecord = record => malformed = record.Reason }, true);
        try
        {
            for (; reader.Read(); malformed = null)
            {
                var row = reader.RowNumber + 1;
                if (malformed is { } reason) columns.Problems.Add(BadQuotes(name, row, reason));
                else if (reader.FieldCount == 1 && reader.GetSpan(0).IsEmpty) continue;
                else if (reader.FieldCount != header.Names.Length) AddRagged(row, reader.FieldCount);
                else AddRow(row);
            }
        }
        catch (CsvFormatException)
        {
            columns.Problems.Add(BadQuotes(name, reader.RowNumber + 2, CsvMalformedReason.UnterminatedQuote));
        }

        void AddRow(long row)
        {
            columns.BeginRow(row);
            var index = columns.Rows - 1;
            // The first reading may be the offered column, which settles the place of the others.
            readings[0].Into.Text(columns.PlaceOf(index), reader.GetSpan(readings[0].Field));
            var place = columns.PlaceOf(index);
            for (var i = 1; i < readings.Length; i++) readings[i].Into.Text(place, reader.GetSpan(readings[i].Field));
            columns.RowsAdded?.Invoke();
        }

        void AddRagged(long row, int fields) => columns.Problems.Add(new Problem(
            "data.ragged_row", name,
            string.Create(CultureInfo.InvariantCulture, $"the row has {fields} {(fields == 1 ? "cell" : "cells")} where the header has {header.Names.Length}"),
            "give every row a cell for each column, and quote text that holds the separator") { Row = row });
    }

    private static Problem BadQuotes(string name, long row, CsvMalformedReason reason) => reason switch
    {
        CsvMalformedReason.UnterminatedQuote => new Problem(
            "data.bad_quotes", name, "a quote is opened in this row and never closed", "close it, or write a quote inside text twice") { Row = row },
        _ => new Problem(
            "data.bad_quotes", name, "a quote stands in the middle of a cell", "put the whole cell in quotes and write the quote inside it twice") { Row = row },
    };

    private static CsvReaderOptions Options(char? separator) => CsvReaderOptions.Default with
    {
        Separator = separator,
        SkipEmptyLines = false,
        MaxRecordSize = LongestRecord,
        FormatProvider = CultureInfo.InvariantCulture,
    };

    private sealed record Header(char? Separator, string[] Names, int Found);
}
