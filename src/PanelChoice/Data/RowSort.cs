using System.Globalization;
using PanelChoice.Numerics;

namespace PanelChoice.Data;

/// <summary>
/// Sorts the rows of a table by person on the disk, with a fixed amount of memory: rows are gathered and written in sorted runs, and the runs are merged
/// whenever the rows are wanted (external merge sort; Knuth 1998, section 5.4). Rows of one person keep their order. Everything it writes is gone with it.
/// </summary>
internal sealed class RowSort : IDisposable
{
    /// <summary>Bytes of each run that a merge reads at a time, at least.</summary>
    private const int LeastBytesAtOnce = 1 << 16;

    /// <summary>Rows between two looks whether the run was cancelled.</summary>
    private const int RowsBetweenLooks = 1 << 14;

    private readonly string beside;
    private readonly WorkContext work;
    private readonly Func<string, long> freeBytes;
    private readonly long memoryBytes;
    private byte[] memory = [];
    private long[] order = [];
    private int rowBytes;
    private int held;
    private long taken;
    private long total;
    private RunFile? file;

    /// <summary>A sort.</summary>
    /// <param name="beside">The file beside which temporary ones are made.</param>
    /// <param name="memoryBytes">Bytes of memory for rows.</param>
    /// <param name="work">Progress and cancellation.</param>
    public RowSort(string beside, long memoryBytes, WorkContext work)
        : this(beside, memoryBytes, work, RunFile.FreeBytes)
    {
    }

    /// <summary>The same with what tells how many bytes are free in a folder.</summary>
    internal RowSort(string beside, long memoryBytes, WorkContext work, Func<string, long> freeBytes)
    {
        this.beside = Path.GetFullPath(beside);
        this.memoryBytes = memoryBytes;
        this.work = work;
        this.freeBytes = freeBytes;
    }

    /// <summary>Begins a sort.</summary>
    /// <param name="bytesOfRow">Bytes of a row.</param>
    /// <param name="rows">Number of rows that will come.</param>
    /// <param name="table">What is sorted, for messages.</param>
    /// <exception cref="DiskWriteException">There is not enough room on the disk, or it cannot be written.</exception>
    public void Begin(int bytesOfRow, long rows, string table)
    {
        (rowBytes, total) = (bytesOfRow, rows);
        var atOnce = (int)Math.Clamp(memoryBytes / (rowBytes + sizeof(long)), 2, Array.MaxLength / rowBytes);
        memory = new byte[atOnce * rowBytes];
        order = new long[atOnce];
        // Where there are too many runs to be merged at once, a second file is written before the first can go.
        var files = (rows + atOnce - 1) / atOnce > MostRuns ? 2 : 1;
        var folder = Path.GetDirectoryName(beside)!;
        if (freeBytes(folder) is var free && free < files * rows * rowBytes)
            throw new DiskWriteException(new IOException(string.Create(
                CultureInfo.InvariantCulture,
                $"the rows of {table} are not sorted by person, and sorting them takes {Megabytes(files * rows * rowBytes, Math.Ceiling)} in its folder, where {Megabytes(free, Math.Floor)} are free.")));
        file = RunFile.Beside(beside);
        work.Report(Step, 0, total);
    }

    /// <summary>Takes all rows that columns hold, whose persons' codes are their places.</summary>
    public void Take(ChoiceColumns columns)
    {
        for (var i = 0; i < columns.Rows; i++)
        {
            if (held == order.Length) WriteRun();
            var row = memory.AsSpan(held * rowBytes, rowBytes);
            columns.Store(i, row);
            // The place behind the person keeps rows of one person in their order.
            order[held] = ((long)ChoiceColumns.PersonOf(row) << 32) | (uint)held;
            held++;
        }

        columns.Forget();
    }

    /// <summary>Ends the coming of rows.</summary>
    public void Complete()
    {
        WriteRun();
        order = [];
        while (file!.Runs.Count > MostRuns)
        {
            var next = RunFile.Beside(beside);
            try
            {
                for (var first = 0; first < file.Runs.Count; first += MostRuns)
                {
                    next.BeginRun();
                    Merge(first, Math.Min(MostRuns, file.Runs.Count - first), next.Write);
                    next.EndRun();
                }
            }
            catch
            {
                next.Dispose();
                throw;
            }

            file.Dispose();
            file = next;
        }

        work.Report(Step, total, total);
    }

    /// <summary>Hands out all rows in order, as often as it is called.</summary>
    public void Visit(RowTaker each) => Merge(0, file!.Runs.Count, each);

    /// <summary>Lets go of memory and removes what is on the disk.</summary>
    public void Dispose()
    {
        memory = [];
        order = [];
        file?.Dispose();
    }

    private const string Step = "sorting the rows";

    /// <summary>Runs that can be merged at once.</summary>
    private int MostRuns => Math.Max(2, memory.Length / Math.Max(LeastBytesAtOnce, rowBytes));

    private static string Megabytes(long bytes, Func<double, double> round) => string.Create(CultureInfo.InvariantCulture, $"{round(bytes / 1e5) / 10:#,0.0} MB");

    private void WriteRun()
    {
        work.Cancellation.ThrowIfCancellationRequested();
        if (held == 0) return;
        order.AsSpan(0, held).Sort();
        file!.BeginRun();
        for (var i = 0; i < held; i++) file.Write(memory.AsSpan((int)(uint)order[i] * rowBytes, rowBytes));
        file.EndRun();
        work.Report(Step, taken += held, total);
        held = 0;
    }

    private void Merge(int firstRun, int runs, RowTaker each)
    {
        if (runs == 0) return;
        // The memory of the rows serves as the runs' buffers now.
        var bytes = memory.Length / runs / rowBytes * rowBytes;
        var readers = new RunReader[runs];
        var next = new PriorityQueue<int, long>(runs);
        for (var r = 0; r < runs; r++)
        {
            readers[r] = new RunReader(file!, firstRun + r, memory.AsMemory(r * bytes, bytes), rowBytes);
            if (readers[r].Advance()) next.Enqueue(r, KeyOf(r));
        }

        for (var rows = 0L; next.TryDequeue(out var r, out _);)
        {
            // A run goes on as long as its rows come before those of all others.
            bool isLeft;
            long key;
            do
            {
                if (++rows % RowsBetweenLooks == 0) work.Cancellation.ThrowIfCancellationRequested();
                each(readers[r].Row);
                isLeft = readers[r].Advance();
                key = isLeft ? KeyOf(r) : 0;
            }
            while (isLeft && (!next.TryPeek(out _, out var other) || key < other));
            if (isLeft) next.Enqueue(r, key);
        }

        // Runs were written in the order of the file.
        long KeyOf(int run) => ((long)ChoiceColumns.PersonOf(readers[run].Row) << 32) | (uint)run;
    }
}

/// <summary>Takes a row as bytes.</summary>
internal delegate void RowTaker(ReadOnlySpan<byte> row);
