using System.Runtime.CompilerServices;
using System.Runtime.InteropServices;
using System.Runtime.Intrinsics;

namespace PanelChoice.Diagnostics;

/// <summary>
/// Sums and products of small matrices whose rows are a multiple of 8 doubles long, zeros at their ends: everything that is done for each situation is a
/// few vector operations without remainders. The order of every sum is fixed by the lengths alone.
/// </summary>
internal static class PaddedRows
{
    /// <summary>Doubles of a vector.</summary>
    public const int Lanes = 8;

    private const int RowsAtOnce = 4;

    /// <summary>A length rounded up to whole vectors.</summary>
    public static int Padded(int length) => (length + Lanes - 1) / Lanes * Lanes;

    /// <summary>Sum of the elementwise product, lane by lane.</summary>
    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static Vector512<double> DotByLane(ReadOnlySpan<double> left, ReadOnlySpan<double> right)
    {
        ref var a = ref MemoryMarshal.GetReference(left);
        ref var b = ref MemoryMarshal.GetReference(right);
        var length = (nuint)Math.Min(left.Length, right.Length);
        var even = Vector512<double>.Zero;
        var odd = Vector512<double>.Zero;
        nuint at = 0;
        for (; at + (2 * Lanes) <= length; at += 2 * Lanes)
        {
            even = Vector512.FusedMultiplyAdd(Vector512.LoadUnsafe(ref a, at), Vector512.LoadUnsafe(ref b, at), even);
            odd = Vector512.FusedMultiplyAdd(Vector512.LoadUnsafe(ref a, at + Lanes), Vector512.LoadUnsafe(ref b, at + Lanes), odd);
        }

        if (at < length) even = Vector512.FusedMultiplyAdd(Vector512.LoadUnsafe(ref a, at), Vector512.LoadUnsafe(ref b, at), even);
        return even + odd;
    }

    /// <summary>Sum of the elementwise product.</summary>
    public static double Dot(ReadOnlySpan<double> left, ReadOnlySpan<double> right) => Vector512.Sum(DotByLane(left, right));

    /// <summary>Adds a multiple of one run of rows to another.</summary>
    public static void Add(double factor, ReadOnlySpan<double> from, Span<double> into)
    {
        ref var a = ref MemoryMarshal.GetReference(from);
        ref var b = ref MemoryMarshal.GetReference(into);
        var f = Vector512.Create(factor);
        var length = (nuint)Math.Min(from.Length, into.Length);
        for (nuint at = 0; at < length; at += Lanes)
            Vector512.FusedMultiplyAdd(f, Vector512.LoadUnsafe(ref a, at), Vector512.LoadUnsafe(ref b, at)).StoreUnsafe(ref b, at);
    }

    /// <summary>sum = factor sum + what is added.</summary>
    public static void Fold(double factor, Span<double> sum, ReadOnlySpan<double> add)
    {
        ref var a = ref MemoryMarshal.GetReference(add);
        ref var s = ref MemoryMarshal.GetReference(sum);
        var f = Vector512.Create(factor);
        var length = (nuint)Math.Min(sum.Length, add.Length);
        for (nuint at = 0; at < length; at += Lanes)
            Vector512.FusedMultiplyAdd(f, Vector512.LoadUnsafe(ref s, at), Vector512.LoadUnsafe(ref a, at)).StoreUnsafe(ref s, at);
    }

    /// <summary>Adds to one row the combination of a matrix' rows with the given weights.</summary>
    /// <param name="weights">One weight for each row; further ones are not read.</param>
    /// <param name="rows">Rows as long as the result.</param>
    /// <param name="count">Number of rows.</param>
    /// <param name="into">The row.</param>
    public static void AddCombination(ReadOnlySpan<double> weights, ReadOnlySpan<double> rows, int count, Span<double> into)
    {
        ref var w = ref MemoryMarshal.GetReference(weights);
        ref var row = ref MemoryMarshal.GetReference(rows);
        ref var to = ref MemoryMarshal.GetReference(into);
        var width = (nuint)into.Length;
        for (nuint at = 0; at < width; at += Lanes)
        {
            var sum = Vector512.LoadUnsafe(ref to, at);
            var place = at;
            for (var r = 0; r < count; r++, place += width)
                sum = Vector512.FusedMultiplyAdd(Vector512.Create(Unsafe.Add(ref w, r)), Vector512.LoadUnsafe(ref row, place), sum);
            sum.StoreUnsafe(ref to, at);
        }
    }

    /// <summary>Adds A B to C, or sets C to it.</summary>
    /// <param name="a">A: element (r, i) stands at r <paramref name="rowStep"/> + i <paramref name="innerStep"/>.</param>
    /// <param name="rowStep">1 for a matrix that is to be taken transposed.</param>
    /// <param name="innerStep">1 for a matrix as it stands.</param>
    /// <param name="b">B: inner x width.</param>
    /// <param name="inner">Inner length.</param>
    /// <param name="rows">Rows of A and C.</param>
    /// <param name="width">Length of the rows of B and C.</param>
    /// <param name="c">C.</param>
    /// <param name="isAdded">Whether C is added to.</param>
    /// <param name="isSymmetric">Whether only the vectors of C on and right of the diagonal are wanted.</param>
    public static void Product(
        ReadOnlySpan<double> a, int rowStep, int innerStep, ReadOnlySpan<double> b, int inner, int rows, int width, Span<double> c, bool isAdded = false,
        bool isSymmetric = false)
    {
        ref var from = ref MemoryMarshal.GetReference(a);
        ref var right = ref MemoryMarshal.GetReference(b);
        ref var to = ref MemoryMarshal.GetReference(c);
        var row = 0;
        for (; row + RowsAtOnce <= rows; row += RowsAtOnce)
            for (var at = isSymmetric ? row / Lanes * Lanes : 0; at < width; at += Lanes)
            {
                ref var c0 = ref Unsafe.Add(ref to, (row * width) + at);
                ref var c1 = ref Unsafe.Add(ref c0, width);
                ref var c2 = ref Unsafe.Add(ref c1, width);
                ref var c3 = ref Unsafe.Add(ref c2, width);
                var s0 = isAdded ? Vector512.LoadUnsafe(ref c0) : Vector512<double>.Zero;
                var s1 = isAdded ? Vector512.LoadUnsafe(ref c1) : Vector512<double>.Zero;
                var s2 = isAdded ? Vector512.LoadUnsafe(ref c2) : Vector512<double>.Zero;
                var s3 = isAdded ? Vector512.LoadUnsafe(ref c3) : Vector512<double>.Zero;
                ref var a0 = ref Unsafe.Add(ref from, row * rowStep);
                ref var x = ref Unsafe.Add(ref right, at);
                for (var i = 0; i < inner; i++)
                {
                    var y = Vector512.LoadUnsafe(ref x);
                    s0 = Vector512.FusedMultiplyAdd(Vector512.Create(a0), y, s0);
                    s1 = Vector512.FusedMultiplyAdd(Vector512.Create(Unsafe.Add(ref a0, rowStep)), y, s1);
                    s2 = Vector512.FusedMultiplyAdd(Vector512.Create(Unsafe.Add(ref a0, 2 * rowStep)), y, s2);
                    s3 = Vector512.FusedMultiplyAdd(Vector512.Create(Unsafe.Add(ref a0, 3 * rowStep)), y, s3);
                    a0 = ref Unsafe.Add(ref a0, innerStep);
                    x = ref Unsafe.Add(ref x, width);
                }

                s0.StoreUnsafe(ref c0);
                s1.StoreUnsafe(ref c1);
                s2.StoreUnsafe(ref c2);
                s3.StoreUnsafe(ref c3);
            }

        for (; row < rows; row++)
            for (var at = isSymmetric ? row / Lanes * Lanes : 0; at < width; at += Lanes)
            {
                ref var c0 = ref Unsafe.Add(ref to, (row * width) + at);
                var s0 = isAdded ? Vector512.LoadUnsafe(ref c0) : Vector512<double>.Zero;
                for (var i = 0; i < inner; i++)
                    s0 = Vector512.FusedMultiplyAdd(
                        Vector512.Create(Unsafe.Add(ref from, (row * rowStep) + (i * innerStep))), Vector512.LoadUnsafe(ref right, (nuint)((i * width) + at)), s0);
                s0.StoreUnsafe(ref c0);
            }
    }

    /// <summary>
    /// Sum of the elementwise product of two symmetric matrices of which only the vectors on and right of the diagonal are there, lane by lane.
    /// </summary>
    public static Vector512<double> SymmetricDotByLane(ReadOnlySpan<double> left, ReadOnlySpan<double> right, int width)
    {
        ref var a = ref MemoryMarshal.GetReference(left);
        ref var b = ref MemoryMarshal.GetReference(right);
        var onDiagonal = Vector512<double>.Zero;
        var beside = Vector512<double>.Zero;
        for (var row = 0; row < width; row++)
        {
            var at = (nuint)((row * width) + (row / Lanes * Lanes));
            var end = (nuint)((row + 1) * width);
            onDiagonal = Vector512.FusedMultiplyAdd(Vector512.LoadUnsafe(ref a, at), Vector512.LoadUnsafe(ref b, at), onDiagonal);
            for (at += Lanes; at < end; at += Lanes)
                beside = Vector512.FusedMultiplyAdd(Vector512.LoadUnsafe(ref a, at), Vector512.LoadUnsafe(ref b, at), beside);
        }

        return onDiagonal + beside + beside;
    }

    /// <summary>The rows without what they are padded with, and below the diagonal what is above it.</summary>
    public static double[] Symmetric(ReadOnlySpan<double> matrix, int size)
    {
        var width = Padded(size);
        var full = new double[size * size];
        for (var r = 0; r < size; r++)
            for (var c = 0; c < size; c++) full[(r * size) + c] = matrix[(Math.Min(r, c) * width) + Math.Max(r, c)];
        return full;
    }
}
