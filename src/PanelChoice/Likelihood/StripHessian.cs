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
    private readonly StripProbabilities probabilities;
    private readonly HessianSums sums;
    private readonly HessianPanel[] panels;
    private readonly StripRows left;
    private readonly StripRows inner;
    private readonly int[] firstInner;
    private readonly int[][] rowInParent;
    private readonly double[] chi;

    /// <summary>Distances of the rows of one node's inner derivatives, and of one alternative's columns, from the first of them.</summary>
    private readonly nuint[] innerPlaces;
    private readonly nuint[] places;

    /// <summary>Sums over strips of the plan's design.</summary>
    public StripHessian(StripPlan plan, Strip strip, StripProbabilities probabilities)
    {
        this.plan = plan;
        this.strip = strip;
        this.probabilities = probabilities;
        sums = new HessianSums(plan.K);
        panels = new HessianPanel[plan.J + plan.Nodes];
        rowInParent = new int[plan.J + plan.Nodes][];
        for (var c = 0; c < panels.Length; c++)
        {
            var right = c < plan.J ? plan.Leaves[c].Stored : plan.Support[c - plan.J];
            int[] constants = c < plan.J ? plan.Leaves[c].Constants : [];
            var parent = plan.Parent[c];
            panels[c] = new HessianPanel(sums, right, constants, parent < 0 ? -1 : plan.NodeParameter[parent]);
            if (parent < 0) continue;
            int[] rows = [.. right, .. constants];
            rowInParent[c] = [.. rows.Select(k => Array.IndexOf(plan.Support[parent], k))];
        }

        firstInner = new int[plan.Nodes + 1];
        for (var n = 0; n < plan.Nodes; n++) firstInner[n + 1] = firstInner[n] + plan.Support[n].Length;
        inner = new StripRows(firstInner[^1], plan.StripLanes);
        left = new StripRows(panels.Max(p => p.LeftRows) + HessianPanel.BlockRows, plan.StripLanes);
        chi = new double[plan.StripLanes];
        innerPlaces = [.. Enumerable.Range(0, plan.K).Select(i => (nuint)(i * inner.Stride))];
        places = new nuint[plan.K];
    }

    /// <summary>Adds the strip.</summary>
    public void Add()
    {
        for (var n = 0; n < plan.Nodes; n++)
        {
            for (var i = firstInner[n]; i < firstInner[n + 1]; i++) inner.Lanes(i, strip.Lanes).Clear();
            if (plan.NodeParameter[n] >= 0)
            {
                if (plan.IsScaled) AddOwnScaled(n);
                else AddOwnUnscaled(n);
            }

            foreach (var c in plan.Children[n])
            {
                if (plan.NodeParameter[n] >= 0) SetCross(n, c);
                if (c < plan.J) AddAlternative(n, c);
                else AddNode(n, c);
            }
        }

        AddRoot();
    }

    /// <summary>Adds sign times the sums to a K x K matrix and starts again from zero.</summary>
    public void Flush(double sign, Span<double> matrix) => sums.Flush(sign, plan.Units, matrix);

    private double FlowScale(int n) => plan.IsScaled ? 1 / strip.Dissimilarity[n] : 1;

    /// <summary>chi, and the second derivative by the node's own l.</summary>
    private void AddOwnScaled(int n)
    {
        var parent = plan.Parent[plan.J + n];
        var ofParent = Vector512.Create(FlowScale(parent));
        var ofOwn = Vector512.Create(FlowScale(n));
        var ofPath = Vector512.Create(1 / (strip.Dissimilarity[n] * strip.Dissimilarity[n]));
        var sum = 2 * ofPath * probabilities.PathSum[n];
        for (nuint lane = 0; lane < (nuint)strip.Lanes; lane += Tile)
        {
            var entropy = Vector512.LoadUnsafe(ref strip.Tilt(n), lane);
            var path = ofPath * Vector512.LoadUnsafe(ref strip.OnPath(plan.J + n), lane);
            var fromParent = ofParent * Vector512.LoadUnsafe(ref strip.Flow(parent), lane) * Vector512.LoadUnsafe(ref strip.Conditional(plan.J + n), lane);
            var x = Vector512.FusedMultiplyAdd(fromParent, entropy, path);
            x.StoreUnsafe(ref chi[0], lane);
            var variance = Vector512<double>.Zero;
            foreach (var c in plan.Children[n])
            {
                var deviation = Vector512.LoadUnsafe(ref strip.LogConditional(c), lane) + entropy;
                variance += Vector512.LoadUnsafe(ref strip.Conditional(c), lane) * deviation * deviation;
            }

            sum += (entropy * (x + path)) + (ofOwn * Vector512.LoadUnsafe(ref strip.Flow(n), lane) * variance);
        }

        sums.Add(sums.Slot(plan.NodeParameter[n], plan.NodeParameter[n]), sum);
    }

    private void AddOwnUnscaled(int n)
    {
        var parent = plan.Parent[plan.J + n];
        var l = Vector512.Create(strip.Dissimilarity[n]);
        var sum = Vector512<double>.Zero;
        for (nuint lane = 0; lane < (nuint)strip.Lanes; lane += Tile)
        {
            var logSum = Vector512.LoadUnsafe(ref strip.Tilt(n), lane);
            var fromParent = Vector512.LoadUnsafe(ref strip.Flow(parent), lane) * Vector512.LoadUnsafe(ref strip.Conditional(plan.J + n), lane) * logSum;
            Vector512.FusedMultiplyAdd(fromParent, l, Vector512.LoadUnsafe(ref strip.Slope(plan.J + n), lane)).StoreUnsafe(ref chi[0], lane);
            sum = Vector512.FusedMultiplyAdd(fromParent, logSum, sum);
        }

        sums.Add(sums.Slot(plan.NodeParameter[n], plan.NodeParameter[n]), sum);
    }

    /// <summary>psi of a child, into the panel's last left row.</summary>
    private void SetCross(int n, int c)
    {
        ref var psi = ref left.Row(panels[c].CrossRow);
        ref var p = ref strip.Conditional(c);
        if (!plan.IsScaled)
        {
            for (nuint lane = 0; lane < (nuint)strip.Lanes; lane += Tile)
                (Vector512.LoadUnsafe(ref p, lane) * Vector512.LoadUnsafe(ref chi[0], lane)).StoreUnsafe(ref psi, lane);
            return;
        }

        var ofOwn = Vector512.Create(FlowScale(n));
        var ofPath = Vector512.Create(1 / (strip.Dissimilarity[n] * strip.Dissimilarity[n]));
        ref var t = ref strip.LogConditional(c);
        ref var entropy = ref strip.Tilt(n);
        ref var flow = ref strip.Flow(n);
        ref var o = ref strip.OnPath(c);
        for (nuint lane = 0; lane < (nuint)strip.Lanes; lane += Tile)
        {
            var deviation = Vector512.LoadUnsafe(ref t, lane) + Vector512.LoadUnsafe(ref entropy, lane);
            var inside = Vector512.LoadUnsafe(ref chi[0], lane) - (ofOwn * Vector512.LoadUnsafe(ref flow, lane) * deviation);
            ((Vector512.LoadUnsafe(ref p, lane) * inside) - (ofPath * Vector512.LoadUnsafe(ref o, lane))).StoreUnsafe(ref psi, lane);
        }
    }

    private void AddAlternative(int n, int j)
    {
        var panel = panels[j];
        var leaf = plan.Leaves[j];
        var ofFlow = Vector512.Create(FlowScale(n));
        ref var flow = ref strip.Flow(n);
        ref var p = ref strip.Conditional(j);
        for (var i = 0; i < leaf.Stored.Length; i++)
        {
            ref var x = ref strip.Columns.Column(leaf.Places[i]);
            ref var weighted = ref left.Row(i);
            ref var z = ref inner.Row(firstInner[n] + rowInParent[j][i]);
            for (nuint lane = 0; lane < (nuint)strip.Lanes; lane += Tile)
            {
                var px = Vector512.LoadUnsafe(ref p, lane) * Vector512.LoadUnsafe(ref x, lane);
                (ofFlow * Vector512.LoadUnsafe(ref flow, lane) * px).StoreUnsafe(ref weighted, lane);
                (Vector512.LoadUnsafe(ref z, lane) + px).StoreUnsafe(ref z, lane);
            }
        }

        for (var i = 0; i < leaf.Constants.Length; i++)
        {
            ref var weighted = ref left.Row(panel.RightRows + i);
            ref var z = ref inner.Row(firstInner[n] + rowInParent[j][panel.RightRows + i]);
            var sum = Vector512<double>.Zero;
            for (nuint lane = 0; lane < (nuint)strip.Lanes; lane += Tile)
            {
                var here = Vector512.LoadUnsafe(ref p, lane);
                var omega = ofFlow * Vector512.LoadUnsafe(ref flow, lane) * here;
                omega.StoreUnsafe(ref weighted, lane);
                sum += omega;
                (Vector512.LoadUnsafe(ref z, lane) + here).StoreUnsafe(ref z, lane);
            }

            for (var other = 0; other <= i; other++) sums.Add(sums.Slot(leaf.Constants[i], leaf.Constants[other]), sum);
        }

        if (panel.Cross >= 0 && leaf.Constants.Length > 0)
        {
            var sum = SumOf(ref left.Row(panel.CrossRow));
            foreach (var k in leaf.Constants) sums.Add(sums.CrossSlot(panel.Cross, k), sum);
        }

        if (leaf.Stored.Length == 0) return;
        ref var first = ref strip.Columns.Column(leaf.Places[0]);
        for (var i = 0; i < leaf.Stored.Length; i++)
            places[i] = (nuint)(Unsafe.ByteOffset(ref first, ref strip.Columns.Column(leaf.Places[i])) / sizeof(double));
        sums.AddProducts(panel, ref left.Row(0), left.Stride, ref first, places, strip.Lanes);
    }

    private void AddNode(int n, int c)
    {
        var panel = panels[c];
        var m = c - plan.J;
        var b = plan.IsScaled ? 1 : strip.Dissimilarity[m];
        var ofParent = Vector512.Create(FlowScale(n) * b * b);
        var ofOwn = Vector512.Create(FlowScale(m));
        var ofInner = Vector512.Create(b);
        ref var parentFlow = ref strip.Flow(n);
        ref var flow = ref strip.Flow(m);
        ref var p = ref strip.Conditional(c);
        for (var i = 0; i < panel.RightRows; i++)
        {
            ref var from = ref inner.Row(firstInner[m] + i);
            ref var weighted = ref left.Row(i);
            ref var z = ref inner.Row(firstInner[n] + rowInParent[c][i]);
            for (nuint lane = 0; lane < (nuint)strip.Lanes; lane += Tile)
            {
                var y = Vector512.LoadUnsafe(ref from, lane);
                var here = Vector512.LoadUnsafe(ref p, lane);
                var omega = (ofParent * Vector512.LoadUnsafe(ref parentFlow, lane) * here) - (ofOwn * Vector512.LoadUnsafe(ref flow, lane));
                (omega * y).StoreUnsafe(ref weighted, lane);
                Vector512.FusedMultiplyAdd(ofInner * here, y, Vector512.LoadUnsafe(ref z, lane)).StoreUnsafe(ref z, lane);
            }
        }

        AddTilt(n, m);
        if (panel.Cross >= 0)
        {
            ref var psi = ref left.Row(panel.CrossRow);
            for (nuint lane = 0; lane < (nuint)strip.Lanes; lane += Tile)
                (ofInner * Vector512.LoadUnsafe(ref psi, lane)).StoreUnsafe(ref psi, lane);
        }

        if (panel.RightRows > 0)
            sums.AddProducts(panel, ref left.Row(0), left.Stride, ref inner.Row(firstInner[m]), innerPlaces, strip.Lanes);
    }

    /// <summary>The part D_m e_m of y_m: into z of the node above, and its cross term with that node's l.</summary>
    private void AddTilt(int n, int m)
    {
        if (plan.NodeParameter[m] is not (>= 0 and var parameter)) return;
        ref var p = ref strip.Conditional(plan.J + m);
        ref var tilt = ref strip.Tilt(m);
        ref var z = ref inner.Row(firstInner[n] + Array.IndexOf(plan.Support[n], parameter));
        for (nuint lane = 0; lane < (nuint)strip.Lanes; lane += Tile)
            Vector512.FusedMultiplyAdd(
                Vector512.LoadUnsafe(ref p, lane), Vector512.LoadUnsafe(ref tilt, lane), Vector512.LoadUnsafe(ref z, lane)).StoreUnsafe(ref z, lane);

        var cross = plan.NodeParameter[n];
        if (cross < 0) return;
        ref var psi = ref left.Row(panels[plan.J + m].CrossRow);
        var sum = Vector512<double>.Zero;
        for (nuint lane = 0; lane < (nuint)strip.Lanes; lane += Tile)
            sum = Vector512.FusedMultiplyAdd(Vector512.LoadUnsafe(ref psi, lane), Vector512.LoadUnsafe(ref tilt, lane), sum);
        sums.Add(sums.CrossSlot(cross, parameter), sum);
    }

    private void AddRoot()
    {
        var panel = panels[plan.J + plan.Root];
        var ofFlow = Vector512.Create(-FlowScale(plan.Root));
        ref var flow = ref strip.Flow(plan.Root);
        for (var i = 0; i < panel.RightRows; i++)
        {
            ref var from = ref inner.Row(firstInner[plan.Root] + i);
            ref var weighted = ref left.Row(i);
            for (nuint lane = 0; lane < (nuint)strip.Lanes; lane += Tile)
                (ofFlow * Vector512.LoadUnsafe(ref flow, lane) * Vector512.LoadUnsafe(ref from, lane)).StoreUnsafe(ref weighted, lane);
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
