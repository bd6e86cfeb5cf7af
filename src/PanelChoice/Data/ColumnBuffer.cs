using System.Collections.Immutable;
using System.Runtime.InteropServices;

namespace PanelChoice.Data;

/// <summary>The entries of a column that were read and not handed over yet: they come in at the end and leave at the beginning.</summary>
/// <typeparam name="T">What an entry is.</typeparam>
internal sealed class ColumnBuffer<T>
    where T : unmanaged
{
    private T[] items = [];
    private int start;

    /// <summary>Number of entries.</summary>
    public int Count { get; private set; }

    /// <summary>An entry.</summary>
    public T this[int index]
    {
        get => items[start + index];
        set => items[start + index] = value;
    }

    /// <summary>The entries.</summary>
    public ReadOnlySpan<T> Span => items.AsSpan(start, Count);

    /// <summary>Adds an entry.</summary>
    public void Add(T item)
    {
        if (start + Count == items.Length)
        {
            // What left at the beginning makes room before anything grows.
            if (start > items.Length / 2) Span.CopyTo(items);
            else Grow(Math.Max(16, checked(2 * Count)));
            start = 0;
        }

        items[start + Count++] = item;
    }

    /// <summary>Makes room for more entries, so that the array that holds them is not made in steps of twice the size.</summary>
    public void Reserve(int more)
    {
        if (start + Count + more <= items.Length) return;
        // A little more than asked for: runs of rows that are taken one after the other leave rests of different lengths.
        if (Count + more <= items.Length) Span.CopyTo(items);
        else Grow(checked(Count + more + (more / 16)));
        start = 0;
    }

    /// <summary>Hands over the first entries.</summary>
    public ImmutableArray<T> Take(int count)
    {
        T[] taken;
        if (start == 0 && count == items.Length)
        {
            taken = items;
            items = [];
            Count = 0;
        }
        else
        {
            taken = Span[..count].ToArray();
            Forget(count);
        }

        return ImmutableCollectionsMarshal.AsImmutableArray(taken);
    }

    /// <summary>Drops the first entries.</summary>
    public void Forget(int count)
    {
        Count -= count;
        start = Count == 0 ? 0 : start + count;
    }

    private void Grow(int length)
    {
        var larger = new T[length];
        Span.CopyTo(larger);
        items = larger;
    }
}
