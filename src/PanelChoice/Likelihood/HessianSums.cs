using System.Runtime.Intrinsics;
using PanelChoice.Design;

namespace PanelChoice.Likelihood;

/// <summary>
/// Sums of second derivatives over strips, lane by lane: one vector for each pair of parameters, and the routine that adds the products of a
/// panel's rows. Lanes are added up only when the sums are flushed.
/// </summary>
internal sealed class HessianSums(int parameters)
{
    private const int Tile = ChoiceDesign.TileLanes;
    private readonly Vector512<double>[] sums = new Vector512<double>[(parameters * parameters) + parameters + 1];

    /// <summary>Takes products that do not count.</summary>
    public int Unused => sums.Length - 1;

    /// <summary>The sum of a pair of parameters, in either order.</summary>
    public int Slot(int k, int q) => (Math.Max(k, q) * parameters) + Math.Min(k, q);

    /// <summary>The sum for u_q where the Hessian receives u e_k' + e_k u': on the diagonal it counts twice.</summary>
    public int CrossSlot(int k, int q) => k == q ? (parameters * parameters) + k : Slot(k, q);

    /// <summary>Adds to a sum.</summary>
    public void Add(int slot, Vector512<double> value) => sums[slot] += value;

    /// <summary>Adds the products of left and right rows of a panel, 4 x 2 at a time.</summary>
    /// <param name="panel">Says where they belong.</param>
    /// <param name="left">First left row; rows up to a multiple of 4 are read, what is in the surplus does not matter.</param>
    /// <param name="leftStride">Distance between left rows.</param>
    /// <param name="right">First right row.</param>
    /// <param name="places">Distance of each right row from the first.</param>
    /// <param name="lanes">Lanes of the strip.</param>
    public void AddProducts(HessianPanel panel, ref double left, int leftStride, ref double right, ReadOnlySpan<nuint> places, int lanes)
    {
        foreach (var (row, column) in panel.Blocks)
        {
            // An odd last column is paired with itself; its twin's products are not added.
            var hasTwin = column + 1 < panel.RightRows;
            var l0 = (nuint)(row * leftStride);
            var l1 = l0 + (nuint)leftStride;
            var l2 = l1 + (nuint)leftStride;
            var l3 = l2 + (nuint)leftStride;
            var r0 = places[column];
            var r1 = hasTwin ? places[column + 1] : r0;
            var s00 = Vector512<double>.Zero;
            var s01 = Vector512<double>.Zero;
            var s10 = Vector512<double>.Zero;
            var s11 = Vector512<double>.Zero;
            var s20 = Vector512<double>.Zero;
            var s21 = Vector512<double>.Zero;
            var s30 = Vector512<double>.Zero;
            var s31 = Vector512<double>.Zero;
            for (nuint lane = 0; lane < (nuint)lanes; lane += Tile)
            {
                var x0 = Vector512.LoadUnsafe(ref right, r0 + lane);
                var x1 = Vector512.LoadUnsafe(ref right, r1 + lane);
                var y = Vector512.LoadUnsafe(ref left, l0 + lane);
                s00 = Vector512.FusedMultiplyAdd(y, x0, s00);
                s01 = Vector512.FusedMultiplyAdd(y, x1, s01);
                y = Vector512.LoadUnsafe(ref left, l1 + lane);
                s10 = Vector512.FusedMultiplyAdd(y, x0, s10);
                s11 = Vector512.FusedMultiplyAdd(y, x1, s11);
                y = Vector512.LoadUnsafe(ref left, l2 + lane);
                s20 = Vector512.FusedMultiplyAdd(y, x0, s20);
                s21 = Vector512.FusedMultiplyAdd(y, x1, s21);
                y = Vector512.LoadUnsafe(ref left, l3 + lane);
                s30 = Vector512.FusedMultiplyAdd(y, x0, s30);
                s31 = Vector512.FusedMultiplyAdd(y, x1, s31);
            }

            sums[panel.SlotOf(row, column)] += s00;
            sums[panel.SlotOf(row + 1, column)] += s10;
            sums[panel.SlotOf(row + 2, column)] += s20;
            sums[panel.SlotOf(row + 3, column)] += s30;
            if (!hasTwin) continue;
            sums[panel.SlotOf(row, column + 1)] += s01;
            sums[panel.SlotOf(row + 1, column + 1)] += s11;
            sums[panel.SlotOf(row + 2, column + 1)] += s21;
            sums[panel.SlotOf(row + 3, column + 1)] += s31;
        }
    }

    /// <summary>Adds sign times the sums, each divided by the units of its two parameters, to a K x K matrix and starts again from zero.</summary>
    public void Flush(double sign, ReadOnlySpan<double> units, Span<double> matrix)
    {
        for (var k = 0; k < parameters; k++)
        {
            for (var q = 0; q < k; q++)
            {
                var sum = sign * Vector512.Sum(sums[Slot(k, q)]) / units[k] / units[q];
                matrix[(k * parameters) + q] += sum;
                matrix[(q * parameters) + k] += sum;
            }

            matrix[(k * parameters) + k] += sign * (Vector512.Sum(sums[Slot(k, k)]) + (2 * Vector512.Sum(sums[CrossSlot(k, k)]))) / units[k] / units[k];
        }

        Array.Clear(sums);
    }
}
