using System.Collections.Immutable;
using System.Security.Cryptography;
using PanelChoice.Study;

namespace PanelChoice.Data;

/// <summary>
/// A data file that was read once from end to end: every cell is checked, and what must be known of the whole is known. Where the rows are few they
/// were kept; where they are many and each person's rows stand together, in the panel's order of persons, the file is read again in parts of whole
/// persons, so that no table of it ever is in memory. Rows in another order are sorted on the disk first, where there is a place for that.
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

    private const int RowsForgottenAtOnce = 8_192;

    private readonly StudySpecification study;
    private readonly FileStamp stamp;
    private readonly ChoiceTable? kept;
    private readonly RowSort? sorted;

    private TableScan(StudySpecification study, TableOutline outline, FileStamp stamp, bool isInOrder, ChoiceTable? kept, RowSort? sorted)
    {
        this.study = study;
        this.stamp = stamp;
        this.kept = kept;
        this.sorted = sorted;
        Outline = outline;
        IsInOrder = isInOrder;
    }

    /// <summary>What is known of the file as a whole.</summary>
    public TableOutline Outline { get; }

    /// <summary>Size and time of the file when it was read.</summary>
    public FileStamp Stamp => stamp;

    /// <summary>Whether the rows of each person stand together in the file, in the panel's order of persons.</summary>
    public bool IsInOrder { get; }

    /// <summary>Reads a study's file.</summary>
    /// <param name="study">The study.</param>
    /// <param name="bytesKept">Bytes of rows up to which the table is kept.</param>
    /// <param name="sort">
    /// Sorts the rows of a file whose table is not kept and which is not in order of persons, and must live as long as the scan is visited; null where its table
    /// is to be held as a whole then.
    /// </param>
    /// <exception cref="DiskWriteException">Rows cannot be sorted on the disk.</exception>
    public static Checked<TableScan> Of(StudySpecification study, long bytesKept, RowSort? sort)
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
            var isInOrder = !rows.AreScattered && columns.PersonsAsTheyCame().SequenceEqual(outline.Persons);
            return Checked<TableScan>.Good(new TableScan(study, outline, stamp, isInOrder, rows.AreKept ? columns.Finish(sha256).Value : null, null));
        });
        return scanned.Value is not { IsInOrder: false, kept: null } scan ? scanned
            : sort is null ? ChoiceTableReader.Read(study).Then(table => Checked<TableScan>.Good(scan.With(table, null)))
            : scan.Sort(sort);
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

        if (sorted is not null)
        {
            var columns = new ChoiceColumns(study, Outline);
            var parts = new PersonsCut(columns, Outline, rowsOfPart, mayEndWith, each);
            sorted.Visit(row =>
            {
                columns.Restore(row);
                parts.Cut();
            });
            parts.CutRest();
            return parts.IsAsBefore ? [] : Changed().Problems;
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

    /// <summary>Reads the file a second time, now that the order of persons is known, and sorts its rows.</summary>
    private Checked<TableScan> Sort(RowSort sort) => ChoiceTableReader.Open<TableScan>(study, (_, read) =>
    {
        if (FileStamp.Of(study) != stamp) return Changed();
        var columns = new ChoiceColumns(study, Outline);
        sort.Begin(columns.StoredBytes, Outline.Rows, Outline.File);
        var rows = 0L;
        var isAsBefore = true;
        columns.RowsAdded = () =>
        {
            if (columns.Rows >= RowsForgottenAtOnce) HandOver();
        };
        read(columns);
        HandOver();
        if (!isAsBefore || rows != Outline.Rows || FileStamp.Of(study) != stamp) return Changed();
        sort.Complete();
        return Checked<TableScan>.Good(With(null, sort));

        void HandOver()
        {
            rows += columns.Rows;
            isAsBefore = isAsBefore && columns.IsAsIn(Outline);
            if (isAsBefore) sort.Take(columns);
            else columns.Forget();
        }
    });

    private TableScan With(ChoiceTable? table, RowSort? sort) => new(study, Outline, stamp, IsInOrder, table, sort);

    private Checked<TableScan> Changed() => Checked<TableScan>.Bad(
        [new Problem("data.changed", study.Panel.File, "the file changed while it was being read", "start again once nothing writes to it")]);

    /// <summary>Looks at rows as they come in: how many there are, and whether persons stand together.</summary>
    private sealed class RowsSeen(ChoiceColumns columns, long bytesKept)
    {
        private readonly int mostKept = (int)Math.Min(int.MaxValue / 2, bytesKept / (16 + (8 * columns.Readings.Length)));
        private int persons;
        private int person = -1;
        private int looked;

        public long Count { get; private set; }

        public bool AreKept { get; private set; } = true;

        /// <summary>Whether rows of others stand between those of some person.</summary>
        public bool AreScattered { get; private set; }

        public void Take()
        {
            var codes = columns.PersonCodes;
            for (; looked < codes.Length; looked++, Count++)
            {
                var code = codes[looked];
                if (code == person || code < 0) continue;
                // Codes count persons as they come: a lower one was here before and left.
                if (code == persons) persons++;
                else AreScattered = true;
                person = code;
            }

            AreKept &= looked <= mostKept;
            if (AreKept || looked < RowsForgottenAtOnce) return;
            columns.Forget();
            looked = 0;
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

    /// <summary>Lower-case hexadecimal SHA-256 of the bytes of a study's data file; null where there is no such file.</summary>
    /// <exception cref="IOException">It cannot be read.</exception>
    public static string? Sha256Of(StudySpecification study)
    {
        if (!File.Exists(study.Panel.FullPath)) return null;
        using var data = File.OpenRead(study.Panel.FullPath);
        return Convert.ToHexStringLower(SHA256.HashData(data));
    }
}
