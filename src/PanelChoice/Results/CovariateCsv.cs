using CsvHelper;
using PanelChoice.Data;

namespace PanelChoice.Results;

/// <summary>Writes covariates as text.</summary>
internal static class CovariateCsv
{
    public static void Write(CovariateTable table, Stream stream)
    {
        using var writer = CsvWriter.Create(stream, CsvWriterOptions.Default with { NewLine = "\n" }, leaveOpen: true);
        var kind = table.Panel.Table.OccasionKind;
        foreach (var name in CovariateTable.KeyNames)
            if (name != "occasion" || kind != OccasionKind.None) writer.WriteField(name);
        foreach (var name in table.Columns) writer.WriteField(name);
        writer.EndRecord();
        for (var row = 0; row < table.Rows; row++)
        {
            writer.WriteField(table.Person(row));
            if (kind == OccasionKind.Date) writer.WriteField(DateOnly.FromDayNumber((int)table.Occasion(row)));
            else if (kind == OccasionKind.WholeNumber) writer.WriteField(table.Occasion(row));
            writer.WriteField(table.Alternative(row));
            writer.WriteField(table.IsChosen(row) ? 1 : 0);
            writer.WriteField(table.IsOffered(row) ? 1 : 0);
            for (var c = 0; c < table.Columns.Length; c++) writer.WriteField(table.Value(row, c));
            writer.EndRecord();
        }
    }
}
