using PanelChoice.Design;
using PanelChoice.Numerics;
using PanelChoice.Study;

namespace PanelChoice.Estimation;

/// <summary>
/// Questions about one direction v of the coefficients, answered from the covariates themselves: the linear index d_j = x_j'v of each offered
/// alternative, situation by situation.
/// </summary>
internal static class LinearIndex
{
    /// <summary>Sum over situations of the squared deviations of the index from its mean inside the choice set.</summary>
    public static double VariationInsideChoiceSets(ChoiceDesign design, double[] v, int threads)
    {
        var parts = new double[FixedChunks.Count(design.Blocks.Length)];
        FixedChunks.Run(design.Blocks.Length, threads, (chunk, first, end) =>
        {
            Walk(design, v, first, end, null, (_, index, _, offered) =>
            {
                double sum = 0, squares = 0;
                var count = 0;
                for (var j = 0; j < index.Length; j++)
                {
                    if (!offered[j]) continue;
                    sum += index[j];
                    count++;
                }

                for (var j = 0; j < index.Length; j++)
                    if (offered[j]) squares += (index[j] - (sum / count)) * (index[j] - (sum / count));
                parts[chunk] += squares;
                return true;
            });
        });
        var total = 0.0;
        foreach (var part in parts) total += part;
        return total;
    }

    /// <summary>
    /// Whether no choice of the persons with positive weight becomes less likely without end along v. Far out along v the slope of log P is,
    /// with D_m = max over children (times l_m in the unscaled form), the sum over the chosen path of the child's D minus the largest
    /// D among its siblings; it is 0 or less, and v separates the choices from the rest where it is 0 in every situation.
    /// </summary>
    /// <param name="design">The design.</param>
    /// <param name="form">The form.</param>
    /// <param name="parameters">K parameters, of which only the dissimilarities matter.</param>
    /// <param name="v">A direction of the coefficients.</param>
    /// <param name="personWeight">Weight of each person.</param>
    /// <param name="tolerance">Slopes this small, as a share of the largest term of the situation, are rounding.</param>
    public static bool NeverGoesAgainstChoices(
        ChoiceDesign design, NestedLogitForm form, ReadOnlySpan<double> parameters, double[] v, double[] personWeight, double tolerance)
    {
        var J = design.Alternatives;
        var nodes = design.Tree.Nodes;
        var l = new double[nodes.Length];
        for (var n = 0; n < l.Length; n++)
            l[n] = form == NestedLogitForm.Unscaled && design.Layout.NodeParameter[n] is var k && k >= 0 ? parameters[k] : 1;
        var parent = new int[J + nodes.Length];
        for (var n = 0; n < nodes.Length; n++)
            foreach (var c in nodes[n].Children) parent[c] = n;
        var value = new double[J + nodes.Length];
        var largest = new double[nodes.Length];

        return Walk(design, v, 0, design.Blocks.Length, personWeight, (chosen, index, size, offered) =>
        {
            for (var j = 0; j < J; j++) value[j] = offered[j] ? index[j] : double.NegativeInfinity;

            for (var n = 0; n < nodes.Length; n++)
            {
                largest[n] = double.NegativeInfinity;
                foreach (var c in nodes[n].Children) largest[n] = Math.Max(largest[n], value[c]);
                value[J + n] = l[n] * largest[n];
            }

            for (var c = chosen; c != J + design.Tree.Root; c = J + parent[c])
                if (value[c] - largest[parent[c]] < -tolerance * size) return false;
            return true;
        });
    }

    /// <summary>Calls back with each situation's choice, index, its largest single term and availability until the callback says false.</summary>
    internal static bool Walk(ChoiceDesign design, double[] v, int firstBlock, int endBlock, double[]? personWeight, Func<int, double[], double, bool[], bool> each)
    {
        var J = design.Alternatives;
        var used = design.Columns.Where(c => v[c.Parameter] != 0).ToArray();
        var index = new double[J];
        var offered = new bool[J];
        var reader = design.Store.Reader();
        for (var b = firstBlock; b < endBlock; b++)
        {
            var block = design.Blocks[b];
            reader.Open(block);
            for (int lane = 0, person = design.PersonOf[block.FirstSituation]; lane < block.Situations; lane++)
            {
                if (block.FirstSituation + lane == design.PersonStart[person + 1]) person++;
                if (personWeight is not null && personWeight[person] == 0) continue;
                for (var j = 0; j < J; j++) offered[j] = reader.IsOffered(lane, j);
                Array.Clear(index);
                var size = 0.0;
                foreach (var c in used)
                {
                    if (!offered[c.Alternative]) continue;
                    var term = v[c.Parameter] * reader.Value(c.Storage, lane);
                    index[c.Alternative] += term;
                    size = Math.Max(size, Math.Abs(term));
                }

                if (!each(reader.ChosenAt(lane), index, size, offered)) return false;
            }
        }

        return true;
    }
}
