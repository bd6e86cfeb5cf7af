namespace PanelChoice.Diagnostics;

/// <summary>
/// Sums over the pairs of persons of dates, formed from sums over persons: a date costs as much as it has persons, never as many pairs.
/// With O = Omega_n, E = E_n of a person, B, G, S sums of E, g, O over the date's persons, F_n = B - E_n:
/// <code>
/// sum of pairs g_n'g_m = (|G|^2 - sum |g|^2) / 2          Q = B'B - sum E'E
/// tr((A O)^2) = |S|^2 - sum |O|^2                         tr((A O)^3) = tr(S^3) - 3 tr(S sum O^2) + 2 sum tr(O^3)
/// M = sum F'O F = B'S B - B'U - U'B + sum E'O E           U = sum O E
/// tr(E'A O A O A E) = |S B - U|^2 - sum |O F|^2           sum |O F|^2 = tr(B' sum O^2 B) - 2 tr(B' sum O^2 E) + sum |O E|^2
/// </code>
/// </summary>
internal sealed class DatePairs
{
    private readonly int J;
    private readonly int K;
    private readonly double[] q;
    private readonly double[] m;
    private readonly double[] withScores;
    private double moment;
    private double squares;
    private double cubes;
    private double crossCubes;

    public DatePairs(int alternatives, int parameters)
    {
        J = alternatives;
        K = parameters;
        q = new double[K * K];
        m = new double[K * K];
        withScores = new double[K];
    }

    /// <summary>Number of dates with two or more persons.</summary>
    public int Dates { get; private set; }

    /// <summary>Numbers that the sums of one date take.</summary>
    public static int DoublesOfDate(int J, int K) => (2 * J) + (4 * J * J) + (4 * J * K) + (2 * K * K) + K;

    /// <summary>Adds a date that is complete: its pairs join the sums.</summary>
    public void Add(OneDate date)
    {
        if (date.Persons < 2) return;
        Dates++;
        moment += (SmallMatrix.Dot(date.G, date.G) - date.ResidualSquares) / 2;
        squares += (SmallMatrix.Dot(date.S, date.S) - date.OmegaSquares) / 2;

        var squared = new double[J * J];
        SmallMatrix.AddProduct(date.S, date.S, J, J, J, squared);
        cubes += SmallMatrix.Dot(squared, date.S) - (3 * SmallMatrix.Dot(date.S, date.OmegaSquared)) + (2 * date.OmegaCubes);

        SmallMatrix.AddTransposedProduct(date.B, date.B, J, K, K, q);
        for (var c = 0; c < q.Length; c++) q[c] -= date.EE[c];

        var w = new double[J * K];
        SmallMatrix.AddProduct(date.S, date.B, J, J, K, w);
        for (var c = 0; c < w.Length; c++) w[c] -= date.U[c];
        SmallMatrix.AddTransposedProduct(date.B, w, J, K, K, m);
        SmallMatrix.AddTransposedProduct(date.U, date.B, J, K, K, m, -1);
        SmallMatrix.Add(date.EOE, m);

        var own = new double[J * K];
        SmallMatrix.AddProduct(date.OmegaSquared, date.B, J, J, K, own);
        crossCubes += SmallMatrix.Dot(w, w)
            - (SmallMatrix.Dot(own, date.B) - (2 * SmallMatrix.Dot(date.B, date.OmegaSquaredE)) + date.OmegaESquares);

        SmallMatrix.AddTransposedProduct(date.B, date.G, J, K, 1, withScores);
        for (var k = 0; k < K; k++) withScores[k] -= date.OwnScores[k];
    }

    /// <summary>Adds the sums of other dates.</summary>
    public void Join(DatePairs other)
    {
        Dates += other.Dates;
        moment += other.moment;
        squares += other.squares;
        cubes += other.cubes;
        crossCubes += other.crossCubes;
        SmallMatrix.Add(other.q, q);
        SmallMatrix.Add(other.m, m);
        SmallMatrix.Add(other.withScores, withScores);
    }

    /// <summary>The date score of all dates joined.</summary>
    /// <param name="totalScore">Total score in the whitening basis.</param>
    public DateMoment Moment(ReadOnlySpan<double> totalScore)
    {
        var bias = SmallMatrix.Trace(q, K) / 2;
        var squared = new double[K * K];
        SmallMatrix.AddProduct(q, q, K, K, K, squared);
        return new DateMoment(
            new CorrectedScore(
                moment - SmallMatrix.Dot(withScores, totalScore) + bias,
                squares - SmallMatrix.Trace(m, K) + (SmallMatrix.Trace(squared, K) / 2),
                moment, squares, bias, Dates),
            cubes - (3 * crossCubes) + (3 * SmallMatrix.Dot(m, q)) - SmallMatrix.Dot(squared, q));
    }

    /// <summary>Sums over the persons of one date.</summary>
    internal sealed class OneDate(int J, int K)
    {
        private readonly double[] o = new double[J * J];
        private readonly double[] oSquared = new double[J * J];
        private readonly double[] oE = new double[J * K];

        public int Persons { get; private set; }

        public double[] G { get; } = new double[J];

        public double[] P { get; } = new double[J];

        public double[] B { get; } = new double[J * K];

        public double[] S { get; } = new double[J * J];

        public double[] U { get; } = new double[J * K];

        public double[] EE { get; } = new double[K * K];

        public double[] EOE { get; } = new double[K * K];

        public double[] OwnScores { get; } = new double[K];

        public double[] OmegaSquared { get; } = new double[J * J];

        public double[] OmegaSquaredE { get; } = new double[J * K];

        public double ResidualSquares { get; private set; }

        public double OmegaSquares { get; private set; }

        public double OmegaCubes { get; private set; }

        public double OmegaESquares { get; private set; }

        public void Add(SituationScores scores)
        {
            Persons++;
            for (var r = 0; r < J; r++)
                for (var c = 0; c < J; c++) o[(r * J) + c] = scores.OmegaAt(r, c);
            Array.Clear(oSquared);
            Array.Clear(oE);
            SmallMatrix.AddProduct(o, o, J, J, J, oSquared);
            SmallMatrix.AddProduct(o, scores.Cross, J, J, K, oE);

            SmallMatrix.Add(scores.Residual, G);
            SmallMatrix.Add(scores.Probability, P);
            SmallMatrix.Add(scores.Cross, B);
            SmallMatrix.Add(o, S);
            SmallMatrix.Add(oE, U);
            SmallMatrix.Add(oSquared, OmegaSquared);
            SmallMatrix.AddTransposedProduct(scores.Cross, scores.Cross, J, K, K, EE);
            SmallMatrix.AddTransposedProduct(scores.Cross, oE, J, K, K, EOE);
            SmallMatrix.AddTransposedProduct(scores.Cross, scores.Residual, J, K, 1, OwnScores);
            SmallMatrix.AddProduct(o, oE, J, J, K, OmegaSquaredE);
            ResidualSquares += SmallMatrix.Dot(scores.Residual, scores.Residual);
            OmegaSquares += SmallMatrix.Dot(o, o);
            OmegaCubes += SmallMatrix.Dot(oSquared, o);
            OmegaESquares += SmallMatrix.Dot(oE, oE);
        }
    }
}
