using System.Collections.Immutable;
using PanelChoice.Design;

namespace PanelChoice.Likelihood;

/// <summary>How far an evaluation goes.</summary>
public enum Derivatives
{
    /// <summary>The log-likelihood alone.</summary>
    None,

    /// <summary>With its gradient.</summary>
    Gradient,

    /// <summary>With gradient and exact Hessian.</summary>
    Hessian,
}

/// <summary>A log-likelihood with its derivatives by all K parameters, free and fixed, in the user's units.</summary>
/// <param name="Value">The weighted log-likelihood.</param>
/// <param name="Gradient">K first derivatives; empty when not asked for.</param>
/// <param name="Hessian">K x K second derivatives, row by row, symmetric; empty when not asked for.</param>
public sealed record LikelihoodEvaluation(double Value, ImmutableArray<double> Gradient, ImmutableArray<double> Hessian);

/// <summary>Sums over the weighted scores w d log P of a sample's situations, by all K parameters, in the user's units.</summary>
/// <param name="ByPerson">Persons x K: the sum over each person's situations, row by row.</param>
/// <param name="Products">K x K: the sum over situations of a score times itself, row by row.</param>
public sealed record SampleScores(double[] ByPerson, double[] Products);

/// <summary>
/// A log-likelihood that is a sum over the persons of a design. Parameters are the K of <see cref="ParameterLayout"/>, in the user's units.
/// Every method is safe to call from several threads at once, and its result does not depend on the number of threads.
/// </summary>
public interface IChoiceLikelihood
{
    /// <summary>The design it is a likelihood of.</summary>
    ChoiceDesign Design { get; }

    /// <summary>Name of the kernel, recorded in results: bits are promised per kernel.</summary>
    string Kernel { get; }

    /// <summary>The log-likelihood: sum over persons of weight times the sum of log P over the person's situations.</summary>
    /// <param name="parameters">K parameters.</param>
    /// <param name="personWeight">One weight for each of the design's persons, 0 or more.</param>
    /// <param name="derivatives">How far to go.</param>
    LikelihoodEvaluation Evaluate(ReadOnlySpan<double> parameters, ReadOnlySpan<double> personWeight, Derivatives derivatives);

    /// <summary>Derivatives of log P of each situation, unweighted: situations x K, row by row.</summary>
    double[] Scores(ReadOnlySpan<double> parameters);

    /// <summary>Derivatives of log P of each situation of one block, unweighted, for callers that cannot hold those of all.</summary>
    /// <param name="parameters">K parameters.</param>
    /// <param name="block">One of the design's blocks.</param>
    /// <param name="scores">Receives the block's situations x K, row by row; may be longer.</param>
    void Scores(ReadOnlySpan<double> parameters, DesignBlock block, Span<double> scores);

    /// <summary>Sums over weighted scores, without those of all situations ever standing side by side.</summary>
    /// <param name="parameters">K parameters.</param>
    /// <param name="personWeight">One weight for each of the design's persons, 0 or more.</param>
    SampleScores SumScores(ReadOnlySpan<double> parameters, ReadOnlySpan<double> personWeight);

    /// <summary>Log P of each situation's choice, unweighted.</summary>
    double[] LogProbabilities(ReadOnlySpan<double> parameters);

    /// <summary>Minus the second derivatives of each person's log-likelihood, unweighted: persons x K x K, row by row.</summary>
    double[] PersonInformation(ReadOnlySpan<double> parameters);

    /// <summary>The same for a run of persons.</summary>
    /// <param name="parameters">K parameters.</param>
    /// <param name="firstPerson">First person.</param>
    /// <param name="endPerson">Person after the last.</param>
    double[] PersonInformation(ReadOnlySpan<double> parameters, int firstPerson, int endPerson);
}
