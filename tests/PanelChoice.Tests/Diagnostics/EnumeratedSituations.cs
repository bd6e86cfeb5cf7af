using System.Collections;
using System.Collections.Immutable;
using PanelChoice.Design;
using PanelChoice.Likelihood;
using PanelChoice.Study;

namespace PanelChoice.Tests.Diagnostics;

/// <summary>
/// The situations of a design on a tree of any depth in either form, every hypothetical choice enumerated by the plain tree recursion, scores by
/// multiplying with the covariates one by one.
/// </summary>
internal sealed class EnumeratedSituations(ChoiceDesign design, NestedLogitForm form, ReadOnlyMemory<double> parameters) : IEnumerable<BruteForce.Row>
{
    private readonly ResidualLayout layout = new(design);

    /// <summary>J + D.</summary>
    public int Size => layout.Size;

    /// <summary>Place and date of the situations; their numbers where it is not set.</summary>
    public ImmutableArray<long> At { get; init; } = [.. Enumerable.Range(0, design.Situations).Select(t => (long)t)];

    public IEnumerator<BruteForce.Row> GetEnumerator()
    {
        var residuals = new ScalarResiduals(layout, form, parameters.Span);
        var reader = design.Store.Reader();
        foreach (var block in design.Blocks)
        {
            residuals.Open(block, 0);
            reader.Open(block);
            for (var lane = 0; lane < block.Situations; lane++)
            {
                residuals.Read(lane);
                var t = block.FirstSituation + lane;
                var f = new double[]?[layout.J];
                for (var i = 0; i < layout.J; i++)
                {
                    if (!reader.IsOffered(lane, i)) continue;
                    f[i] = new double[layout.Size];
                    residuals.Hypothetical(i, f[i]);
                }

                double[]?[] s = [.. f.Select(x => x is null ? null : Score(x, residuals.Covariates))];
                yield return new BruteForce.Row(design.PersonOf[t], At[t], At[t], reader.ChosenAt(lane), residuals.Probability[..layout.J], f, s);
            }
        }
    }

    IEnumerator IEnumerable.GetEnumerator() => GetEnumerator();

    private double[] Score(double[] f, double[] covariates)
    {
        var s = new double[layout.K];
        for (var c = 0; c < covariates.Length; c++)
            if (layout.FreeIndex[design.Columns[c].Parameter] is >= 0 and var k) s[k] += covariates[c] * f[design.Columns[c].Alternative];
        for (var d = 0; d < layout.ParameterOf.Length; d++) s[layout.ParameterOf[d]] += f[layout.J + d];
        return s;
    }
}
