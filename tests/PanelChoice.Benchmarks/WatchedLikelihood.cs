using PanelChoice.Design;
using PanelChoice.Likelihood;

namespace PanelChoice.Benchmarks;

/// <summary>A likelihood that writes down what a fit asks of it and how long that takes, so that the fit can be told apart into its passes.</summary>
internal sealed class WatchedLikelihood(IChoiceLikelihood watched) : IChoiceLikelihood
{
    private readonly SortedDictionary<string, (int Calls, double Seconds)> asked = new(StringComparer.Ordinal);

    public ChoiceDesign Design => watched.Design;

    public string Kernel => watched.Kernel;

    /// <summary>What was asked, how often, and the seconds it took.</summary>
    public IReadOnlyDictionary<string, (int Calls, double Seconds)> Asked => asked;

    public LikelihoodEvaluation Evaluate(ReadOnlySpan<double> parameters, ReadOnlySpan<double> personWeight, Derivatives derivatives)
    {
        var from = ThreadClock.Seconds();
        var at = watched.Evaluate(parameters, personWeight, derivatives);
        WriteDown($"{derivatives} on {(personWeight.Contains(0) ? "the thinned sample" : "all data")}", from);
        return at;
    }

    public double[] Scores(ReadOnlySpan<double> parameters) => throw new NotSupportedException();

    public void Scores(ReadOnlySpan<double> parameters, DesignBlock block, Span<double> scores)
    {
        var from = ThreadClock.Seconds();
        watched.Scores(parameters, block, scores);
        WriteDown("scores of a block", from);
    }

    public SampleScores SumScores(ReadOnlySpan<double> parameters, ReadOnlySpan<double> personWeight) => throw new NotSupportedException();

    public double[] LogProbabilities(ReadOnlySpan<double> parameters) => throw new NotSupportedException();

    public double[] PersonInformation(ReadOnlySpan<double> parameters) => throw new NotSupportedException();

    public double[] PersonInformation(ReadOnlySpan<double> parameters, int firstPerson, int endPerson) => throw new NotSupportedException();

    private void WriteDown(string what, double from)
    {
        var before = asked.GetValueOrDefault(what);
        asked[what] = (before.Calls + 1, before.Seconds + ThreadClock.Seconds() - from);
    }
}
