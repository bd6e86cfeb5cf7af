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
/// Sums that no product joins with those of the date (E'E, E'OE, |g|^2, ...) are kept for all dates together. Rows are padded with zeros
/// (<see cref="PaddedRows"/>); of symmetric K x K matrices only what is on and right of the diagonal is there.
/// </summary>
internal sealed class DatePairs
{
    private readonly int J;
    private readonly int K;
    private readonly int widthJ;
    private readonly int widthK;
    private readonly double[] q;
    private readonly double[] m;
    private readonly double[] withScores;
    private readonly double[] ownQ;
    private readonly double[] ownM;
    private readonly double[] ownScores;
    private double moment;
    private double squares;
    private double cubes;
    private double crossCubes;

    public DatePairs(int alternatives, int parameters)
    {
        J = alternatives;
        K = parameters;
        widthJ = PaddedRows.Padded(J);
        widthK = PaddedRows.Padded(K);
        q = new double[widthK * widthK];
        m = new double[widthK * widthK];
        withScores = new double[widthK];
        ownQ = new double[widthK * widthK];
        ownM = new double[widthK * widthK];
        ownScores = new double[widthK];
    }

    /// <summary>Number of dates with two or more persons.</summary>
    public int Dates { get; private set; }

    /// <summary>Numbers that the sums of one date take.</summary>
    public static int DoublesOfDate(int J, int K) => (2 * PaddedRows.Padded(J) * (1 + J)) + (3 * J * PaddedRows.Padded(K));

    /// <summary>Adds what a person of a date with two or more persons brings to the sums that do not depend on the date.</summary>
    public void AddPerson(PersonOnDate person)
    {
        var residual = person.Residual;
        moment -= PaddedRows.Dot(residual, residual) / 2;
        squares -= PaddedRows.Dot(person.Omega, person.Omega) / 2;
        cubes += 2 * PaddedRows.Dot(person.OmegaSquared, person.Omega);
        crossCubes -= PaddedRows.Dot(person.OmegaE, person.OmegaE);
        PaddedRows.Product(person.E, 1, widthK, person.E, J, widthK, widthK, ownQ, isAdded: true, isSymmetric: true);
        PaddedRows.Product(person.E, 1, widthK, person.OmegaE, J, widthK, widthK, ownM, isAdded: true, isSymmetric: true);
        PaddedRows.AddCombination(residual, person.E, J, ownScores);
    }

    /// <summary>Adds a date with two or more persons that is complete: its pairs join the sums.</summary>
    public void Add(OneDate date)
    {
        Dates++;
        moment += PaddedRows.Dot(date.G, date.G) / 2;
        squares += PaddedRows.Dot(date.S, date.S) / 2;

        var squared = new double[J * widthJ];
        PaddedRows.Product(date.S, widthJ, 1, date.S, J, J, widthJ, squared);
        cubes += PaddedRows.Dot(squared, date.S) - (3 * PaddedRows.Dot(date.S, date.OmegaSquared));

        PaddedRows.Product(date.B, 1, widthK, date.B, J, widthK, widthK, q, isAdded: true, isSymmetric: true);

        var w = new double[J * widthK];
        var minusU = new double[J * widthK];
        PaddedRows.Add(-1, date.U, minusU);
        PaddedRows.Product(date.S, widthJ, 1, date.B, J, J, widthK, w);
        PaddedRows.Add(1, minusU, w);
        PaddedRows.Product(date.B, 1, widthK, w, J, widthK, widthK, m, isAdded: true, isSymmetric: true);
        PaddedRows.Product(minusU, 1, widthK, date.B, J, widthK, widthK, m, isAdded: true, isSymmetric: true);

        var own = new double[J * widthK];
        PaddedRows.Product(date.OmegaSquared, widthJ, 1, date.B, J, J, widthK, own);
        crossCubes += PaddedRows.Dot(w, w) - (PaddedRows.Dot(own, date.B) - (2 * PaddedRows.Dot(date.B, date.OmegaSquaredE)));

        PaddedRows.AddCombination(date.G, date.B, J, withScores);
    }

    /// <summary>Adds the sums of other dates.</summary>
    public void Join(DatePairs other)
    {
        Dates += other.Dates;
        moment += other.moment;
        squares += other.squares;
        cubes += other.cubes;
        crossCubes += other.crossCubes;
        PaddedRows.Add(1, other.q, q);
        PaddedRows.Add(1, other.m, m);
        PaddedRows.Add(1, other.withScores, withScores);
        PaddedRows.Add(1, other.ownQ, ownQ);
        PaddedRows.Add(1, other.ownM, ownM);
        PaddedRows.Add(1, other.ownScores, ownScores);
    }

    /// <summary>The date score of all dates joined.</summary>
    /// <param name="totalScore">Total score in the whitening basis.</param>
    public DateMoment Moment(ReadOnlySpan<double> totalScore)
    {
        var between = PaddedRows.Symmetric(q, K);
        var own = PaddedRows.Symmetric(ownQ, K);
        for (var c = 0; c < between.Length; c++) between[c] -= own[c];
        var weighted = PaddedRows.Symmetric(m, K);
        SmallMatrix.Add(PaddedRows.Symmetric(ownM, K), weighted);
        var shift = 0.0;
        for (var k = 0; k < K; k++) shift += (withScores[k] - ownScores[k]) * totalScore[k];

        var bias = SmallMatrix.Trace(between, K) / 2;
        var squared = new double[K * K];
        SmallMatrix.AddProduct(between, between, K, K, K, squared);
        return new DateMoment(
            new CorrectedScore(
                moment - shift + bias,
                squares - SmallMatrix.Trace(weighted, K) + (SmallMatrix.Trace(squared, K) / 2),
                moment, squares, bias, Dates),
            cubes - (3 * crossCubes) + (3 * SmallMatrix.Dot(weighted, between)) - SmallMatrix.Dot(squared, between));
    }

    /// <summary>Sums over the persons of one date.</summary>
    internal sealed class OneDate(int J, int K)
    {
        public double[] G { get; } = new double[PaddedRows.Padded(J)];

        public double[] P { get; } = new double[PaddedRows.Padded(J)];

        public double[] B { get; } = new double[J * PaddedRows.Padded(K)];

        public double[] S { get; } = new double[J * PaddedRows.Padded(J)];

        public double[] U { get; } = new double[J * PaddedRows.Padded(K)];

        public double[] OmegaSquared { get; } = new double[J * PaddedRows.Padded(J)];

        public double[] OmegaSquaredE { get; } = new double[J * PaddedRows.Padded(K)];

        public void Add(PersonOnDate person)
        {
            PaddedRows.Add(1, person.Residual, G);
            PaddedRows.Add(1, person.Probability, P);
            PaddedRows.Add(1, person.E, B);
            PaddedRows.Add(1, person.Omega, S);
            PaddedRows.Add(1, person.OmegaE, U);
            PaddedRows.Add(1, person.OmegaSquared, OmegaSquared);
            PaddedRows.Add(1, person.OmegaSquaredE, OmegaSquaredE);
        }
    }
}
