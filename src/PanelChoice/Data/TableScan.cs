using System.Collections.Immutable;
using System.Security.Cryptography;
using PanelChoice.Study;

namespace PanelChoice.Data;

/// <summary>
/// A data file that was read once from end to end: every cell is checked, and what must be known of the whole is known. Where the rows are few they
/// were kept; where they are many and each person's rows stand together, in the panel's order of persons, the file is read again in parts of whole
/// persons, so that no table of it ever is in memory.
/// </summary>
internal sealed class TableScan
{
    /// <summary>
    /// Bytes of rows up to which a table is kept. Covariates can be many times larger than the rows they are made from (ten lags of a column), so that
    /// only what is small in any case is worth more in memory than read again.
    /// </summary>
    public const long BytesKept = 4 << 20;

    /// <summary>Rows of a part, unless a person has more: few enough that what is made of them stays far below the memory of the design.</summary>
    public const int RowsOfPart = 16_384;

    private readonly StudySpecification study;
    private readonly FileStamp stamp;
    private readonly ChoiceTable? kept;

    private TableScan(StudySpecification study, TableOutline outline, FileStamp stamp, Problem? disorder, ChoiceTable? kept)
    {
        this.study = study;
        this.stamp = stamp;
        this.kept = kept;
        Outline = outline;
        Disorder = disorder;
    }

    /// <summary>What is known of the file as a whole.</summary>
    public TableOutline Outline { get; }

    /// <summary>Size and time of the file when it was read.</summary>
    public FileStamp Stamp => stamp;

    /// <summary>Why the file cannot be read in parts; null where it can.</summary>
    public Problem? Disorder { get; }

    /// <summary>Reads a study's file.</summary>
    /// <param name="study">The study.</param>
    /// <param name="bytesKept">Bytes of rows up to which the table is kept.</param>
    /// <param name="mustBeOrdered">Whether a file whose table is not kept is refused where it is not in order of persons; otherwise its table is held as a whole.</param>
    public static Checked<TableScan> Of(StudySpecification study, long bytesKept, bool mustBeOrdered)
    {
        var scanned = ChoiceTableReader.Open<TableScan>(study, (file, read) =>
        {
            var stamp = FileStamp.Of(study);
            var sha256 = Convert.ToHexStringLower(SHA256.HashData(file));
            var columns = new ChoiceColumns(study);
            var rows = new RowsSeen(columns, bytesKept);
            columns.RowsAdded = rows.Take;
            read(columns);
            var wrong = columns.AllProblems(rows.Count);
            if (!wrong.IsEmpty) return Checked<TableScan>.Bad(wrong);
            var outline = columns.Outline(sha256, rows.Count);
            var disorder = rows.Disorder(study, columns.PersonsAsTheyCame(), outline.Persons);
            if (disorder is not null && mustBeOrdered && !rows.AreKept) return Checked<TableScan>.Bad([disorder]);
            return Checked<TableScan>.Good(new TableScan(study, outline, stamp, disorder, rows.AreKept ? columns.Finish(sha256).Value : null));
        });
        return scanned.Value is { Disorder: not null, kept: null } scan
            ? ChoiceTableReader.Read(study).Then(table => Checked<TableScan>.Good(new TableScan(study, scan.Outline, scan.stamp, scan.Disorder, table)))
            : scanned;
    }

    /// <summary>
    /// Hands out the file's rows as tables of whole persons, in the panel's order: the whole table where it is held, otherwise parts.
    /// </summary>
    /// <param name="rowsOfPart">Rows of a part, unless a person has more.</param>
    /// <param name="mayEndWith">Whether a part may end with a person, by the person's place in the panel.</param>
    /// <param name="each">Gets each table, and the place of its first person.</param>
    /// <returns>What went wrong: <c>data.changed</c> where the file is not what it was, or it cannot be read any more; empty when all is well.</returns>
    public ImmutableArray<Problem> Visit(int rowsOfPart, Func<int, bool> mayEndWith, Action<ChoiceTable, int> each)
    {
        if (kept is not null)
        {
            each(kept, 0);
            return [];
        }

        return ChoiceTableReader.Open<TableScan>(study, (_, read) =>
        {
            if (FileStamp.Of(study) != stamp) return Changed();
            var columns = new ChoiceColumns(study, Outline);
            var parts = new PersonsCut(columns, Outline, rowsOfPart, mayEndWith, each);
            columns.RowsAdded = parts.Cut;
            read(columns);
            parts.CutRest();
            return parts.IsAsBefore && FileStamp.Of(study) == stamp ? Checked<TableScan>.Good(this) : Changed();
        }).Problems;
    }

    private Checked<TableScan> Changed() => Checked<TableScan>.Bad(
        [new Problem("data.changed", study.Panel.File, "the file changed while it was being read", "start again once nothing writes to it")]);

    /// <summary>Looks at rows as they come in: how many there are, and whether persons stand together.</summary>
    private sealed class RowsSeen(ChoiceColumns columns, long bytesKept)
    {
        private const int RowsForgottenAtOnce = 8_192;

        private readonly List<long> firstRow = [];
        private readonly int mostKept = (int)Math.Min(int.MaxValue / 2, bytesKept / (16 + (8 * columns.Readings.Length)));
        private (long Row, int Person)? scattered;
        private int person = -1;
        private int looked;

        public long Count { get; private set; }

        public bool AreKept { get; private set; } = true;

        public void Take()
        {
            var codes = columns.PersonCodes;
            for (; looked < codes.Length; looked++, Count++)
            {
                var code = codes[looked];
                if (code == person || code < 0) continue;
                // Codes count persons as they come: a lower one was here before and left.
                if (code == firstRow.Count) firstRow.Add(columns.SourceRow(looked));
                else scattered ??= (columns.SourceRow(looked), code);
                person = code;
            }

            AreKept &= looked <= mostKept;
            if (AreKept || looked < RowsForgottenAtOnce) return;
            columns.Forget();
            looked = 0;
        }

        /// <summary>The first row at which the file is not in the panel's order of persons; null where it is.</summary>
        public Problem? Disorder(StudySpecification study, ImmutableArray<string> asTheyCame, ImmutableArray<string> inOrder)
        {
            var order = NameOrder.AreWholeNumbers(inOrder) ? "by number" : "as text, character by character";
            Problem At(long row, string who, string what) => new(
                "data.not_in_order", study.Panel.File, what,
                $"sort the file's rows by '{study.Panel.Person}', {order}; the order inside a person does not matter") { Row = row, Column = study.Panel.Person, Value = who };
            if (scattered is { } at) return At(at.Row, asTheyCame[at.Person], "this person's rows began further up, and rows of others stand between");
            for (var p = 0; p < inOrder.Length; p++)
                if (asTheyCame[p] != inOrder[p])
                    return At(firstRow[p], asTheyCame[p], $"this person comes before '{inOrder[p]}', who belongs here");
            return null;
        }
    }

    /// <summary>Cuts rows as they come in into tables of whole persons.</summary>
    private sealed class PersonsCut(ChoiceColumns columns, TableOutline outline, int rowsOfPart, Func<int, bool> mayEndWith, Action<ChoiceTable, int> each)
    {
        private int looked;
        private int ready;
        private long handedOver;

        public bool IsAsBefore { get; private set; } = true;

        public void Cut()
        {
            if (!IsAsBefore)
            {
                columns.Forget();
                return;
            }

            // A part ends before the row at which the next person begins.
            for (looked = Math.Max(1, looked); looked < columns.Rows; looked++)
            {
                var before = columns.PersonCodes[looked - 1];
                if (columns.PersonCodes[looked] == before) continue;
                if (columns.PersonCodes[looked] != before + 1)
                {
                    IsAsBefore = false;
                    return;
                }

                if (!mayEndWith(before)) continue;
                ready = looked;
                if (ready >= rowsOfPart) HandOver();
            }
        }

        public void CutRest()
        {
            Cut();
            ready = columns.Rows;
            if (IsAsBefore && ready > 0) HandOver();
            IsAsBefore &= handedOver == outline.Rows;
        }

        private void HandOver()
        {
            var first = columns.PersonCodes[0];
            var rows = ready;
            if (columns.TakePersons(rows, outline) is not { } table)
            {
                IsAsBefore = false;
                return;
            }

            handedOver += rows;
            looked = ready = 0;
            each(table, first);
        }
    }
}

/// <summary>Size and time of a file, by which a change is seen without reading it.</summary>
/// <param name="Bytes">Its size.</param>
/// <param name="Written">When it was last written, in ticks of universal time.</param>
internal readonly record struct FileStamp(long Bytes, long Written)
{
    /// <summary>The stamp of a study's data file.</summary>
    public static FileStamp Of(StudySpecification study)
    {
        var info = new FileInfo(study.Panel.FullPath);
        return new FileStamp(info.Length, info.LastWriteTimeUtc.Ticks);
    }
}
