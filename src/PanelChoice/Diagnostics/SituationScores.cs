using PanelChoice.Design;
using PanelChoice.Likelihood;

namespace PanelChoice.Diagnostics;

/// <summary>
/// The scores of one situation after another, and what is expected of them given the past, from its residuals (<see cref="SituationResiduals"/>).
/// <code>
/// f = (g, d log P / dl)     s = Z' f (K)     Z = blockdiag(X, who owns which l)     g: the first J of f
/// E = Cov(g, s) = the first J rows of Omega Z     I = Cov(s, s) = Z' Omega Z
/// </code>
/// K counts the free parameters. With a basis B the scores are B s instead, so that in the basis that whitens the total information every A_ss^-1 of the
/// battery's formulas is the identity. Rows are padded with zeros to whole vectors (<see cref="PaddedRows"/>).
/// One instance is a work space: it is not for use by several threads at once.
/// </summary>
internal sealed class SituationScores
{
    private readonly SituationResiduals residuals;

    /// <summary>B' with each row divided by the units of its parameter's covariates.</summary>
    private readonly double[] basis;

    /// <summary>For each alternative its columns and their parameters, numbered among the free ones.</summary>
    private readonly (int Column, int Parameter)[][] columns;
    private readonly double[] z;
    private readonly double[] product;
    private readonly double[] informationTimes;

    /// <summary>A work space.</summary>
    /// <param name="residuals">The residuals, at the parameters they were made for.</param>
    /// <param name="basis">K x K matrix B over the free parameters, row by row; null for the scores themselves.</param>
    public SituationScores(SituationResiduals residuals, double[]? basis)
    {
        this.residuals = residuals;
        var layout = residuals.Layout;
        var design = layout.Design;
        J = layout.J;
        K = layout.K;
        Width = PaddedRows.Padded(K);
        this.basis = new double[K * Width];
        for (var k = 0; k < K; k++)
            for (var r = 0; r < K; r++)
                this.basis[(k * Width) + r] = (basis is null ? (r == k ? 1 : 0) : basis[(r * K) + k]) / residuals.UnitsOf(design.Layout.Free[k]);

        columns = [.. Enumerable.Range(0, J).Select(j => Enumerable.Range(0, design.Columns.Length)
            .Where(i => design.Columns[i].Alternative == j && layout.FreeIndex[design.Columns[i].Parameter] >= 0)
            .Select(i => (i, layout.FreeIndex[design.Columns[i].Parameter])).ToArray())];
        z = new double[layout.Size * Width];
        for (var d = 0; d < layout.ParameterOf.Length; d++)
            this.basis.AsSpan(layout.ParameterOf[d] * Width, Width).CopyTo(z.AsSpan((J + d) * Width));
        product = new double[layout.Size * Width];
        informationTimes = new double[layout.Stride];
        Score = new double[Width];
        Information = new double[Width * Width];
    }

    /// <summary>Number of alternatives.</summary>
    public int J { get; }

    /// <summary>Number of free parameters.</summary>
    public int K { get; }

    /// <summary>K rounded up to whole vectors: the length of <see cref="Score"/> and of the rows of <see cref="Cross"/>.</summary>
    public int Width { get; }

    /// <summary>Length of the padded rows in the space (V, l).</summary>
    public int ResidualWidth => residuals.Layout.Stride;

    /// <summary>P_i (padded J); 0 where not offered.</summary>
    public double[] Probability => residuals.Probability;

    /// <summary>f of the observed choice: g, then its derivatives by dissimilarities.</summary>
    public double[] Residual => residuals.Residual;

    /// <summary>Omega, rows of <see cref="ResidualWidth"/>; Cov(g, g) is its J x J part.</summary>
    public double[] Omega => residuals.Covariance;

    /// <summary>Score s of the observed choice, in the basis.</summary>
    public double[] Score { get; }

    /// <summary>E = Cov(g, s), J rows of <see cref="Width"/>, in the basis.</summary>
    public ReadOnlySpan<double> Cross => product.AsSpan(0, J * Width);

    /// <summary>I as <see cref="SetInformation"/> left it: <see cref="Width"/> squared, only the vectors on and right of the diagonal.</summary>
    public double[] Information { get; }

    /// <summary>Cov(g_j, g_k).</summary>
    public double OmegaAt(int j, int k) => residuals.Covariance[(j * residuals.Layout.Stride) + k];

    /// <summary>Loads the situations of a block one after the other.</summary>
    /// <param name="block">The block.</param>
    /// <param name="visit">Called with each situation when it is loaded.</param>
    /// <param name="isWanted">Says which are; all where it is null.</param>
    public void ForEach(DesignBlock block, Action<int> visit, Func<int, bool>? isWanted = null)
    {
        for (var first = 0; first < block.Situations;)
        {
            var count = residuals.Open(block, first);
            for (var place = 0; place < count; place++)
            {
                var situation = block.FirstSituation + first + place;
                if (isWanted is not null && !isWanted(situation)) continue;
                Load(place);
                visit(situation);
            }

            first += count;
        }
    }

    /// <summary>Computes everything but I for a situation of the open run.</summary>
    private void Load(int place)
    {
        residuals.Read(place);
        for (var j = 0; j < J; j++)
        {
            var row = z.AsSpan(j * Width, Width);
            row.Clear();
            foreach (var (column, parameter) in columns[j])
                PaddedRows.Add(residuals.Covariates[column], basis.AsSpan(parameter * Width, Width), row);
        }

        var size = residuals.Layout.Size;
        Array.Clear(Score);
        PaddedRows.AddCombination(residuals.Residual, z, size, Score);
        PaddedRows.Product(residuals.Covariance, residuals.Layout.Stride, 1, z, size, size, Width, product);
    }

    /// <summary>Computes I of the loaded situation.</summary>
    public void SetInformation() =>
        PaddedRows.Product(z, 1, Width, product, residuals.Layout.Size, Width, Width, Information, isSymmetric: true);

    /// <summary>Adds I to a matrix held as <see cref="Information"/> is.</summary>
    public void AddInformation(Span<double> information) =>
        PaddedRows.Product(z, 1, Width, product, residuals.Layout.Size, Width, Width, information, isAdded: true, isSymmetric: true);

    /// <summary>Receives I times a vector (both padded K).</summary>
    public void ApplyInformation(ReadOnlySpan<double> vector, Span<double> result)
    {
        var size = residuals.Layout.Size;
        for (var r = 0; r < size; r++) informationTimes[r] = PaddedRows.Dot(product.AsSpan(r * Width, Width), vector);
        result.Clear();
        PaddedRows.AddCombination(informationTimes, z, size, result);
    }
}
