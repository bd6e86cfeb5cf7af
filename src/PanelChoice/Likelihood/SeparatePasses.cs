namespace PanelChoice.Likelihood;

/// <summary>Replicates one after the other, for a kernel that has no pass of its own for many.</summary>
/// <param name="likelihood">The kernel.</param>
internal sealed class SeparatePasses(IChoiceLikelihood likelihood) : IReplicateLikelihood
{
    /// <summary>The kernel's own way where it has one, else separate passes.</summary>
    public static IReplicateLikelihood Of(IChoiceLikelihood likelihood) => likelihood as IReplicateLikelihood ?? new SeparatePasses(likelihood);

    public LikelihoodEvaluation[] Gradients(IReadOnlyList<WeightedPoint> points, CancellationToken cancellation)
    {
        var evaluations = new LikelihoodEvaluation[points.Count];
        for (var i = 0; i < evaluations.Length; i++)
        {
            cancellation.ThrowIfCancellationRequested();
            evaluations[i] = likelihood.Evaluate(points[i].Parameters, points[i].PersonWeight, Derivatives.Gradient);
        }

        return evaluations;
    }

    public void ForEachPerson(double[] parameters, PersonDerivatives take, CancellationToken cancellation)
    {
        var design = likelihood.Design;
        var K = design.Layout.Count;
        var scores = likelihood.Scores(parameters);
        var information = likelihood.PersonInformation(parameters);
        var score = new double[K];
        var hessian = new double[K * K];
        for (var person = 0; person < design.Persons; person++)
        {
            cancellation.ThrowIfCancellationRequested();
            Array.Clear(score);
            for (var s = design.PersonStart[person]; s < design.PersonStart[person + 1]; s++)
                for (var k = 0; k < K; k++) score[k] += scores[(s * K) + k];
            for (var i = 0; i < hessian.Length; i++) hessian[i] = -information[(person * K * K) + i];
            take(person, score, hessian);
        }
    }
}
