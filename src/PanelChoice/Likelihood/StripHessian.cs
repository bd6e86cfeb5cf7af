using System.Runtime.CompilerServices;
using System.Runtime.InteropServices;
using System.Runtime.Intrinsics;
using PanelChoice.Design;

namespace PanelChoice.Likelihood;

/// <summary>
/// Sums second derivatives over strips. It is the formula of <see cref="ScalarNestedLogit"/>, sorted by children so that each works with
/// its own few rows. With the letters of <see cref="StripProbabilities"/>, k_m = f_m / l_m (utility-scaled) or f_m (unscaled), B_m = 1 or
/// l_m, D_m the tilt, the derivative of W_m by all parameters is y_m = B_m z_m + D_m e_m, z_m = sum of p_c y_c (for an alternative its
/// covariates), and child c of node m brings
/// <code>
/// omega_c (z_c z_c') + (B_c psi_c z_c + psi_c D_c e_c) e_m' and its transpose          (alternative: B = 1, no D)
///   omega_c = k_m p_c B_c^2 - k_c     (alternative: k_m p_c; root: -k)
///   psi_c   = p_c chi_m                                                      chi_m = a_m + k_parent p_m l_m L_m         (unscaled)
///   psi_c   = p_c (chi_m - k_m (t_c + E_m)) - o_c / l_m^2                    chi_m = o_m / l_m^2 + k_parent p_m E_m     (utility-scaled)
/// and node m brings to the second derivative by its own l
///   k_parent p_m L_m^2                                                                                             (unscaled)
///   E_m (chi_m + o_m / l_m^2) + k_m sum of p_c (t_c + E_m)^2 + 2 (sum of o_c t_c) / l_m^2                          (utility-scaled)
/// </code>
/// </summary>
internal sealed class StripHessian
{
    private const int Tile = ChoiceDesign.TileLanes;
    private readonly StripPlan plan;
    private readonly Strip strip;
    private readonly HessianSums sums;
    private readonly DissimilarityTerms dissimilarity;
    private readonly HessianPanel[] panels;
    private readonly StripRows left;
    private readonly StripRows inner;
    private readonly StripRows ofChild;
    private readonly int[] firstInner;

    /// <summary>For each right row and constant of a child the row of its parent's z; whether the child is the first to write it.</summary>
    private readonly (int Row, bool IsFirst)[][] targets;

    /// <summary>The same for the l of each node.</summary>
    private readonly (int Row, bool IsFirst)[] ownTarget;

    /// <summary>Distances of the rows of one node's inner derivatives, and of one alternative's columns, from the first of them.</summary>
    private readonly nuint[] innerPlaces;
    private readonly nuint[] places;

    /// <summary>Sums over strips of the plan's design.</summary>
    public StripHessian(StripPlan plan, Strip strip, StripProbabilities probabilities)
    {
        this.plan = plan;
        this.strip = strip;
        sums = new HessianSums(plan.K);
        dissimilarity = new DissimilarityTerms(plan, strip, probabilities, sums);
        firstInner = new int[plan.Nodes + 1];
        for (var n = 0; n < plan.Nodes; n++) firstInner[n + 1] = firstInner[n] + plan.Support[n].Length;
        panels = new HessianPanel[plan.J + plan.Nodes];
        targets = new (int, bool)[panels.Length][];
        ownTarget = new (int, bool)[plan.Nodes];
        var written = new HashSet<int>();
        for (var n = 0; n < plan.Nodes; n++)
            foreach (var c in plan.Children[n]) SetPanel(n, c, written);
        panels[^1] = new HessianPanel(sums, plan.Support[plan.Root], [], -1);
        inner = new StripRows(firstInner[^1], plan.StripLanes);
        left = new StripRows(panels.Max(p => p.LeftRows) + HessianPanel.BlockRows, plan.StripLanes);
        ofChild = new StripRows(2, plan.StripLanes);
        innerPlaces = [.. Enumerable.Range(0, plan.K).Select(i => (nuint)(i * inner.Stride))];
        places = new nuint[plan.K];
    }

    /// <summary>For the child at work: what weighs the products of its right rows.</summary>
    private ref double Omega => ref ofChild.Row(0);

    /// <summary>For the child at work: B p, its right rows' part in the z of the node above.</summary>
    private ref double Share => ref ofChild.Row(1);

    /// <summary>Adds the strip.</summary>
    public void Add()
    {
        strip.Columns.Unfold();
        for (var n = 0; n < plan.Nodes; n++)
        {
            if (plan.NodeParameter[n] >= 0) dissimilarity.AddOwn(n);
            foreach (var c in plan.Children[n])
            {
                if (plan.NodeParameter[n] >= 0) dissimilarity.SetCross(n, c, ref left.Row(panels[c].CrossRow));
                if (c < plan.J) AddAlternative(n, c);
                else AddNode(n, c);
            }
        }

        AddRoot();
    }

    /// <summary>Adds sign times the sums to a K x K matrix and starts again from zero.</summary>
    public void Flush(double sign, Span<double> matrix) => sums.Flush(sign, plan.Units, matrix);

    private void SetPanel(int n, int c, HashSet<int> written)
    {
        var right = c < plan.J ? plan.Leaves[c].Stored : plan.Support[c - plan.J];
        int[] constants = c < plan.J ? plan.Leaves[c].Constants : [];
        panels[c] = new HessianPanel(sums, right, constants, plan.NodeParameter[n]);
        targets[c] = [.. right.Concat(constants).Select(TargetOf)];
        if (c >= plan.J && plan.NodeParameter[c - plan.J] is >= 0 and var own) ownTarget[c - plan.J] = TargetOf(own);

        (int Row, bool IsFirst) TargetOf(int parameter)
        {
            var row = firstInner[n] + Array.IndexOf(plan.Support[n], parameter);
            return (row, written.Add(row));
        }
    }

    private void AddAlternative(int n, int j)
    {
        var panel = panels[j];
        var leaf = plan.Leaves[j];
        SetWeights(n, j);
        for (var i = 0; i < leaf.Constants.Length; i++) AddConstant(leaf, panel, i, targets[j][panel.RightRows + i]);
        if (panel.Cross >= 0 && leaf.Constants.Length > 0)
        {
            var sum = SumOf(ref left.Row(panel.CrossRow));
            foreach (var k in leaf.Constants) sums.Add(sums.CrossSlot(panel.Cross, k), sum);
        }

        if (leaf.Stored.Length == 0) return;
        ref var first = ref strip.Columns.Column(leaf.Places[0]);
        for (var i = 0; i < leaf.Stored.Length; i++)
            places[i] = (nuint)(Unsafe.ByteOffset(ref first, ref strip.Columns.Column(leaf.Places[i])) / sizeof(double));
        WeighRows(panel.RightRows, ref first, places, targets[j]);
        sums.AddProducts(panel, ref left.Row(0), left.Stride, ref first, places, strip.Lanes);
    }

    private void AddConstant(LeafColumns leaf, HessianPanel panel, int i, (int Row, bool IsFirst) target)
    {
        ref var omega = ref Omega;
        ref var share = ref Share;
        ref var weighted = ref left.Row(panel.RightRows + i);
        ref var z = ref inner.Row(target.Row);
        var sum = Vector512<double>.Zero;
        for (nuint lane = 0, end = (nuint)strip.Lanes; lane < end; lane += Tile)
        {
            var here = Vector512.LoadUnsafe(ref omega, lane);
            here.StoreUnsafe(ref weighted, lane);
            sum += here;
            var p = Vector512.LoadUnsafe(ref share, lane);
            (target.IsFirst ? p : Vector512.LoadUnsafe(ref z, lane) + p).StoreUnsafe(ref z, lane);
        }

        for (var other = 0; other <= i; other++) sums.Add(sums.Slot(leaf.Constants[i], leaf.Constants[other]), sum);
    }

    private void AddNode(int n, int c)
    {
        var panel = panels[c];
        var m = c - plan.J;
        SetWeights(n, c);
        ref var first = ref inner.Row(firstInner[m]);
        WeighRows(panel.RightRows, ref first, innerPlaces, targets[c]);
        AddTilt(n, m);
        if (panel.Cross >= 0 && !plan.IsScaled)
        {
            var b = Vector512.Create(strip.Dissimilarity[m]);
            ref var psi = ref left.Row(panel.CrossRow);
            for (nuint lane = 0, end = (nuint)strip.Lanes; lane < end; lane += Tile) (b * Vector512.LoadUnsafe(ref psi, lane)).StoreUnsafe(ref psi, lane);
        }

        if (panel.RightRows > 0) sums.AddProducts(panel, ref left.Row(0), left.Stride, ref first, innerPlaces, strip.Lanes);
    }

    /// <summary>omega and B p of a child.</summary>
    private void SetWeights(int n, int c)
    {
        var isNode = c >= plan.J;
        var b = isNode && !plan.IsScaled ? strip.Dissimilarity[c - plan.J] : 1;
        var ofAbove = Vector512.Create(strip.Scale(n) * b * b);
        var ofOwn = Vector512.Create(isNode ? strip.Scale(c - plan.J) : 0);
        var ofShare = Vector512.Create(b);
        ref var flowAbove = ref strip.FlowOverSum(n);
        ref var inverse = ref strip.Inverse(n);
        ref var power = ref strip.Power(c);
        ref var flow = ref strip.Flow(isNode ? c - plan.J : n);
        ref var omega = ref Omega;
        ref var share = ref Share;
        for (nuint lane = 0, end = (nuint)strip.Lanes; lane < end; lane += Tile)
        {
            var e = Vector512.LoadUnsafe(ref power, lane);
            ((ofAbove * Vector512.LoadUnsafe(ref flowAbove, lane) * e) - (ofOwn * Vector512.LoadUnsafe(ref flow, lane))).StoreUnsafe(ref omega, lane);
            (ofShare * Vector512.LoadUnsafe(ref inverse, lane) * e).StoreUnsafe(ref share, lane);
        }
    }

    /// <summary>Right rows y of a child: omega y into the left rows, B p y into z of the node above. Two rows at a time.</summary>
    private void WeighRows(int count, ref double right, ReadOnlySpan<nuint> rightPlaces, (int Row, bool IsFirst)[] into)
    {
        ref var omega = ref Omega;
        ref var share = ref Share;
        for (var i = 0; i < count; i += 2)
        {
            var hasTwin = i + 1 < count;
            var (target0, target1) = (into[i], into[hasTwin ? i + 1 : i]);
            ref var y0 = ref Unsafe.Add(ref right, rightPlaces[i]);
            ref var y1 = ref Unsafe.Add(ref right, rightPlaces[hasTwin ? i + 1 : i]);
            ref var weighted = ref left.Row(i);
            ref var weighted1 = ref left.Row(i + 1);
            ref var z0 = ref inner.Row(target0.Row);
            ref var z1 = ref inner.Row(target1.Row);
            for (nuint lane = 0, end = (nuint)strip.Lanes; lane < end; lane += Tile)
            {
                var w = Vector512.LoadUnsafe(ref omega, lane);
                var p = Vector512.LoadUnsafe(ref share, lane);
                var y = Vector512.LoadUnsafe(ref y0, lane);
                (w * y).StoreUnsafe(ref weighted, lane);
                (target0.IsFirst ? p * y : Vector512.FusedMultiplyAdd(p, y, Vector512.LoadUnsafe(ref z0, lane))).StoreUnsafe(ref z0, lane);
                if (!hasTwin) continue;
                y = Vector512.LoadUnsafe(ref y1, lane);
                (w * y).StoreUnsafe(ref weighted1, lane);
                (target1.IsFirst ? p * y : Vector512.FusedMultiplyAdd(p, y, Vector512.LoadUnsafe(ref z1, lane))).StoreUnsafe(ref z1, lane);
            }
        }
    }

    /// <summary>The part D_m e_m of y_m: into z of the node above, and its cross term with that node's l.</summary>
    private void AddTilt(int n, int m)
    {
        if (plan.NodeParameter[m] is not (>= 0 and var parameter)) return;
        ref var inverse = ref strip.Inverse(n);
        ref var power = ref strip.Power(plan.J + m);
        ref var tilt = ref strip.Tilt(m);
        var target = ownTarget[m];
        ref var z = ref inner.Row(target.Row);
        for (nuint lane = 0, end = (nuint)strip.Lanes; lane < end; lane += Tile)
        {
            var part = Vector512.LoadUnsafe(ref power, lane) * Vector512.LoadUnsafe(ref inverse, lane) * Vector512.LoadUnsafe(ref tilt, lane);
            (target.IsFirst ? part : Vector512.LoadUnsafe(ref z, lane) + part).StoreUnsafe(ref z, lane);
        }

        var cross = plan.NodeParameter[n];
        if (cross < 0) return;
        ref var psi = ref left.Row(panels[plan.J + m].CrossRow);
        var sum = Vector512<double>.Zero;
        for (nuint lane = 0, end = (nuint)strip.Lanes; lane < end; lane += Tile)
            sum = Vector512.FusedMultiplyAdd(Vector512.LoadUnsafe(ref psi, lane), Vector512.LoadUnsafe(ref tilt, lane), sum);
        sums.Add(sums.CrossSlot(cross, parameter), sum);
    }

    /// <summary>Omega of the root's own inner derivatives is the situation's weight.</summary>
    private void AddRoot()
    {
        var panel = panels[plan.J + plan.Root];
        ref var weight = ref strip.Weight;
        for (var i = 0; i < panel.RightRows; i++)
        {
            ref var from = ref inner.Row(firstInner[plan.Root] + i);
            ref var weighted = ref left.Row(i);
            for (nuint lane = 0, end = (nuint)strip.Lanes; lane < end; lane += Tile)
                (Vector512.LoadUnsafe(ref weight, lane) * Vector512.LoadUnsafe(ref from, lane)).StoreUnsafe(ref weighted, lane);
        }

        sums.AddProducts(panel, ref left.Row(0), left.Stride, ref inner.Row(firstInner[plan.Root]), innerPlaces, strip.Lanes);
    }

    private Vector512<double> SumOf(ref double row)
    {
        var sum = Vector512<double>.Zero;
        foreach (var v in MemoryMarshal.Cast<double, Vector512<double>>(MemoryMarshal.CreateReadOnlySpan(ref row, strip.Lanes))) sum += v;
        return sum;
    }
}
