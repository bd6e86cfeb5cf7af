namespace PanelChoice.Likelihood;

/// <summary>Parameters at which a likelihood is wanted, and the weights of the persons there.</summary>
/// <param name="Parameters">K parameters.</param>
/// <param name="PersonWeight">One weight for each of the design's persons, 0 or more.</param>
internal sealed record WeightedPoint(double[] Parameters, double[] PersonWeight);

/// <summary>Takes the derivatives of one person's log-likelihood, unweighted.</summary>
/// <param name="person">The person.</param>
/// <param name="score">K first derivatives.</param>
/// <param name="hessian">K x K second derivatives, row by row.</param>
internal delegate void PersonDerivatives(int person, ReadOnlySpan<double> score, ReadOnlySpan<double> hessian);

/// <summary>A likelihood that serves many replicates of a sample, each with its own weights and parameters, from one read of the data.</summary>
internal interface IReplicateLikelihood
{
    /// <summary>
    /// Value and gradient at each point. The bits at a point depend on that point alone: not on the points beside it, nor on the number of threads.
    /// </summary>
    /// <param name="points">The points.</param>
    /// <param name="cancellation">Stops between chunks of the data.</param>
    /// <exception cref="OperationCanceledException">Cancelled.</exception>
    LikelihoodEvaluation[] Gradients(IReadOnlyList<WeightedPoint> points, CancellationToken cancellation);

    /// <summary>Hands over each person's derivatives, person after person on the calling thread.</summary>
    /// <param name="parameters">K parameters.</param>
    /// <param name="take">Called once for each person, in their order.</param>
    /// <param name="cancellation">Stops between stretches of persons.</param>
    /// <exception cref="OperationCanceledException">Cancelled.</exception>
    void ForEachPerson(double[] parameters, PersonDerivatives take, CancellationToken cancellation);
}
