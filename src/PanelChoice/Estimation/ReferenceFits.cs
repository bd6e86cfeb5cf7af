using PanelChoice.Design;
using PanelChoice.Optimisation;

namespace PanelChoice.Estimation;

/// <summary>
/// The log-likelihoods a fit is compared with: every offered alternative equally likely, and alternative-specific constants alone in a plain
/// logit. Both depend on the sample only through how often each alternative is chosen from each choice set, so they are computed from those counts.
/// </summary>
internal sealed class ReferenceFits
{
    private readonly int J;
    private readonly List<(int[] Offered, double[] Chosen)> sets;

    private ReferenceFits(int alternatives, List<(int[] Offered, double[] Chosen)> sets)
    {
        J = alternatives;
        this.sets = sets;
    }

    /// <summary>Counts the choices of a sample under weights.</summary>
    public static ReferenceFits Of(ChoiceDesign design, double[] personWeight)
    {
        var J = design.Alternatives;
        var counts = new Dictionary<string, (int[] Offered, double[] Chosen)>(StringComparer.Ordinal);
        var bySpan = counts.GetAlternateLookup<ReadOnlySpan<char>>();
        var key = new char[J];
        double[]? chosen = null;
        var reader = design.Store.Reader();
        foreach (var block in design.Blocks)
        {
            reader.Open(block);
            for (int lane = 0, person = design.PersonOf[block.FirstSituation]; lane < block.Situations; lane++)
            {
                if (block.FirstSituation + lane == design.PersonStart[person + 1]) person++;
                // What is on offer seldom changes from one occasion to the next.
                if (IsAsBefore(reader, lane, key) && chosen is not null)
                {
                    chosen[reader.ChosenAt(lane)] += personWeight[person];
                    continue;
                }

                if (!bySpan.TryGetValue(key, out var set))
                    counts[new string(key)] = set = ([.. Enumerable.Range(0, J).Where(j => key[j] == '1')], new double[J]);
                chosen = set.Chosen;
                chosen[reader.ChosenAt(lane)] += personWeight[person];
            }
        }

        return new ReferenceFits(J, [.. counts.OrderBy(c => c.Key, StringComparer.Ordinal).Select(c => c.Value)]);
    }

    /// <summary>Whether a lane offers what the key says; if not, the key is changed.</summary>
    private static bool IsAsBefore(BlockReader reader, int lane, char[] key)
    {
        var same = true;
        for (var j = 0; j < key.Length; j++)
        {
            var now = reader.IsOffered(lane, j) ? '1' : '0';
            same &= now == key[j];
            key[j] = now;
        }

        return same;
    }

    /// <summary>The log-likelihood with every offered alternative equally likely.</summary>
    public double EqualProbability
    {
        get
        {
            var sum = 0.0;
            foreach (var (offered, chosen) in sets) sum -= chosen.Sum() * Math.Log(offered.Length);
            return sum;
        }
    }

    /// <summary>
    /// The maximum over constants; null when it does not exist. It exists when, inside every group of alternatives linked by common choice
    /// sets, each can be reached from each along "was chosen where the other was offered" (Ford 1957).
    /// </summary>
    public double? Constants()
    {
        var beats = new bool[J, J];
        var linked = new bool[J, J];
        foreach (var (offered, chosen) in sets)
            foreach (var i in offered)
                foreach (var j in offered)
                {
                    linked[i, j] = true;
                    beats[i, j] |= chosen[i] > 0;
                }

        Close(beats);
        Close(linked);
        for (var i = 0; i < J; i++)
            for (var j = 0; j < J; j++)
                if (linked[i, j] && !beats[i, j]) return null;

        // The first alternative of each group is the base.
        var free = Enumerable.Range(0, J).Where(j => linked[j, j] && Enumerable.Range(0, j).Any(i => linked[i, j])).ToArray();
        var unit = sets.Sum(s => s.Chosen.Sum());
        var best = TrustRegionNewton.Minimise(x => Minus(x, free, unit), new double[free.Length], new MinimisationSettings());
        return best.IsMinimum ? -best.Value * unit : null;
    }

    private SmoothValue Minus(ReadOnlySpan<double> x, int[] free, double unit)
    {
        var n = free.Length;
        var constant = new double[J];
        var place = new int[J];
        Array.Fill(place, -1);
        for (var i = 0; i < n; i++)
        {
            constant[free[i]] = x[i];
            place[free[i]] = i;
        }

        var value = 0.0;
        var gradient = new double[n];
        var hessian = new double[n * n];
        foreach (var (offered, chosen) in sets)
        {
            var max = offered.Max(j => constant[j]);
            var logSum = max + Math.Log(offered.Sum(j => Math.Exp(constant[j] - max)));
            var total = chosen.Sum() / unit;
            foreach (var j in offered)
            {
                var p = Math.Exp(constant[j] - logSum);
                value -= chosen[j] / unit * (constant[j] - logSum);
                if (place[j] is not (>= 0 and var a)) continue;
                gradient[a] += (total * p) - (chosen[j] / unit);
                hessian[(a * n) + a] += total * p;
                foreach (var q in offered)
                    if (place[q] is >= 0 and var b) hessian[(a * n) + b] -= total * p * Math.Exp(constant[q] - logSum);
            }
        }

        return new SmoothValue(value, gradient, hessian);
    }

    private void Close(bool[,] reach)
    {
        for (var k = 0; k < J; k++)
            for (var i = 0; i < J; i++)
                for (var j = 0; j < J; j++) reach[i, j] |= reach[i, k] && reach[k, j];
    }
}
