using System.Collections.Immutable;
using PanelChoice.Design;
using PanelChoice.Likelihood;
using PanelChoice.Study;

namespace PanelChoice.Estimation;

/// <summary>A free coefficient that the sample cannot tell, and the coefficients it is a combination of (none: its column does not vary).</summary>
/// <param name="Parameter">The coefficient, which is held at 0.</param>
/// <param name="With">Other free coefficients whose columns make it up inside choice sets.</param>
internal sealed record Redundancy(int Parameter, ImmutableArray<int> With);

/// <summary>
/// Which free coefficients can be told apart, before anything is fitted. Minus the Hessian of the log-likelihood at zero coefficients and plain
/// logit is the cross-product matrix of within-choice-set deviations, sum_i (1/J_i) sum_j (x_ij - mean_i)(x_ij - mean_i)', so one pass of the
/// kernel gives it for any size of data. A Cholesky factorisation in the order of the study (the R of a QR factorisation of the deviations)
/// finds the columns that are a combination of earlier ones; because cross-products square the rounding, each suspect is then confirmed on the
/// deviations themselves. The later column is the redundant one, so that what the study names first is kept.
/// </summary>
internal static class Identification
{
    /// <summary>Share of a column's variance left unexplained by the earlier columns below which it is a suspect.</summary>
    private const double Suspect = 1e-9;

    /// <summary>Share of a column's variance left unexplained on a part of the sample above which the whole needs no look.</summary>
    private const double Clear = 1e-6;

    /// <summary>
    /// Share of a column's standard deviation left unexplained below which it is redundant: what rounding a column to single precision can
    /// leave (6e-8), with a margin of ten.
    /// </summary>
    private const double Redundant = 1e-6;

    /// <summary>The redundant free coefficients, in the order of the study.</summary>
    /// <param name="likelihood">The likelihood.</param>
    /// <param name="form">Its form.</param>
    /// <param name="evidence">Evidence on each parameter in the sample.</param>
    /// <param name="scale">Scale of each column.</param>
    /// <param name="threads">Threads, 1 or more.</param>
    public static ImmutableArray<Redundancy> Check(
        IChoiceLikelihood likelihood, NestedLogitForm form, Evidence[] evidence, double[] scale, int threads)
    {
        var design = likelihood.Design;
        var layout = design.Layout;
        var redundant = ImmutableArray.CreateBuilder<Redundancy>();
        var varying = new List<int>();
        foreach (var k in layout.Free)
        {
            if (k >= layout.Coefficients) continue;
            if (evidence[k].HasFlag(Evidence.Varies) || (form == NestedLogitForm.Unscaled && !IsPlain(layout))) varying.Add(k);
            else redundant.Add(new Redundancy(k, []));
        }

        var n = varying.Count;
        // More persons can only tell more columns apart: what a part of them tells needs no second look.
        if (ThinnedSample.Weights(design) is { } part && TellsAll(CrossProducts(likelihood, form, varying, scale, part), n)) return redundant.DrainToImmutable();
        var cross = CrossProducts(likelihood, form, varying, scale, Ones(design.Persons));
        var kept = new List<int>();
        // Rows of the Cholesky factor, one for each kept column, over all columns.
        var factor = new List<double[]>();
        for (var i = 0; i < n; i++)
        {
            var left = cross[(i * n) + i];
            foreach (var row in factor) left -= row[i] * row[i];
            if (left <= Suspect * cross[(i * n) + i] || cross[(i * n) + i] <= 0)
            {
                var combination = Combination(factor, kept, i);
                if (IsConfirmed(design, form, varying, scale, kept, combination, i, left, cross[(i * n) + i], threads))
                {
                    redundant.Add(new Redundancy(varying[i], [.. kept.Where((_, q) => Math.Abs(combination[q]) > 1e-6).Select(q => varying[q])]));
                    continue;
                }
            }

            var pivot = Math.Sqrt(Math.Max(left, double.Epsilon));
            var next = new double[n];
            for (var j = i; j < n; j++)
            {
                var sum = cross[(i * n) + j];
                foreach (var row in factor) sum -= row[i] * row[j];
                next[j] = sum / pivot;
            }

            kept.Add(i);
            factor.Add(next);
        }

        return [.. redundant.OrderBy(r => r.Parameter)];
    }

    /// <summary>Whether a Cholesky factorisation leaves every column a clear part of its variance.</summary>
    private static bool TellsAll(double[] cross, int n)
    {
        var factor = (double[])cross.Clone();
        for (var i = 0; i < n; i++)
        {
            var left = factor[(i * n) + i];
            if (!(left > Clear * cross[(i * n) + i])) return false;
            for (var j = i + 1; j < n; j++)
            {
                var share = factor[(i * n) + j] / left;
                for (var q = j; q < n; q++) factor[(j * n) + q] -= share * factor[(i * n) + q];
            }
        }

        return true;
    }

    /// <summary>Coefficients of column i on the kept columns, by back substitution.</summary>
    private static double[] Combination(List<double[]> factor, List<int> kept, int i)
    {
        var c = new double[kept.Count];
        for (var q = kept.Count - 1; q >= 0; q--)
        {
            c[q] = factor[q][i];
            for (var p = q + 1; p < kept.Count; p++) c[q] -= factor[q][kept[p]] * c[p];
            c[q] /= factor[q][kept[q]];
        }

        return c;
    }

    private static bool IsConfirmed(
        ChoiceDesign design, NestedLogitForm form, List<int> varying, double[] scale, List<int> kept, double[] combination, int i, double left,
        double own, int threads)
    {
        // In the unscaled form a shift common to a choice set is not neutral, so the deviations do not decide; its information matrix does.
        if (form == NestedLogitForm.Unscaled && !IsPlain(design.Layout)) return left <= Redundant * Redundant * own || own <= 0;
        var v = new double[design.Layout.Count];
        v[varying[i]] = 1 / scale[varying[i]];
        var whole = LinearIndex.VariationInsideChoiceSets(design, v, threads);
        for (var q = 0; q < kept.Count; q++) v[varying[kept[q]]] = -combination[q] / scale[varying[kept[q]]];
        return LinearIndex.VariationInsideChoiceSets(design, v, threads) <= Redundant * Redundant * whole;
    }

    private static bool IsPlain(ParameterLayout layout) => layout.Nests.IsEmpty;

    /// <summary>The cross-product matrix of the scaled columns.</summary>
    private static double[] CrossProducts(IChoiceLikelihood likelihood, NestedLogitForm form, List<int> varying, double[] scale, double[] weight)
    {
        var layout = likelihood.Design.Layout;
        var K = layout.Count;
        var at = new double[K];
        for (var k = layout.Coefficients; k < K; k++)
        {
            // The unscaled form is taken at unequal dissimilarities, where a shift common to a choice set counts as it does in the estimate.
            at[k] = form == NestedLogitForm.UtilityScaled ? 1 : layout.Parameters[k].Fixed ?? 0.4 + (0.4 * (k - layout.Coefficients + 1) / (K - layout.Coefficients + 1));
        }

        var hessian = likelihood.Evaluate(at, weight, Derivatives.Hessian).Hessian;
        var n = varying.Count;
        var cross = new double[n * n];
        for (var i = 0; i < n; i++)
            for (var j = 0; j < n; j++)
                cross[(i * n) + j] = -hessian[(varying[i] * K) + varying[j]] / (scale[varying[i]] * scale[varying[j]]);
        return cross;
    }

    private static double[] Ones(int count)
    {
        var ones = new double[count];
        Array.Fill(ones, 1);
        return ones;
    }
}
