using System.Collections.Immutable;
using System.Runtime.CompilerServices;
using System.Runtime.InteropServices;

namespace PanelChoice.Data;

/// <summary>A column whose entries are values of one type.</summary>
/// <typeparam name="T">What an entry is.</typeparam>
/// <param name="file">The data file as the study writes it.</param>
/// <param name="name">Name of the column.</param>
internal abstract class ValueColumn<T>(string file, string name) : CellColumn(file, name)
    where T : unmanaged
{
    /// <summary>The entries held.</summary>
    protected ColumnBuffer<T> Values { get; } = new();

    /// <inheritdoc/>
    public sealed override int StoredBytes => Unsafe.SizeOf<T>();

    /// <summary>Hands over the first entries.</summary>
    public ImmutableArray<T> Take(int count) => Values.Take(count);

    /// <inheritdoc/>
    public sealed override void Reserve(int more) => Values.Reserve(more);

    /// <inheritdoc/>
    public sealed override void Forget(int count) => Values.Forget(count);

    /// <inheritdoc/>
    public sealed override void Store(int index, Span<byte> to) => MemoryMarshal.Write(to, Values[index]);

    /// <inheritdoc/>
    public sealed override void Restore(ReadOnlySpan<byte> from) => Values.Add(MemoryMarshal.Read<T>(from));
}
