using System.Collections.Immutable;
using System.Runtime.InteropServices;
using PanelChoice.Design;

namespace PanelChoice.Estimation;

/// <summary>A request with what every way of refitting needs.</summary>
/// <param name="Request">The request.</param>
/// <param name="Active">Parameters that move, ascending.</param>
/// <param name="PersonWeight">Weight of each person: sampling weight times that of the cluster. Never written to.</param>
/// <param name="Start">All K parameters to start from, fixed ones at their values.</param>
internal sealed record PreparedRefit(RefitRequest Request, ImmutableArray<int> Active, double[] PersonWeight, double[] Start)
{
    /// <summary>Prepares a request.</summary>
    /// <param name="model">The model.</param>
    /// <param name="request">The request.</param>
    public static PreparedRefit Of(FittedModel model, RefitRequest request)
    {
        var design = model.Design;
        var start = request.Start.ToArray();
        for (var k = 0; k < start.Length; k++) start[k] = model.Layout.Parameters[k].Fixed ?? start[k];
        return new PreparedRefit(request, [.. model.Layout.Free.Except(model.Held).Except(request.Held)], PersonWeightOf(design, request), start);
    }

    /// <summary>The request's own array where it says the same, so that the weights of a large panel are held once.</summary>
    private static double[] PersonWeightOf(ChoiceDesign design, RefitRequest request)
    {
        if (design.Persons == design.Clusters.Length && Enumerable.Range(0, design.Persons).All(p => design.ClusterOf[p] == p && design.PersonWeight[p] == 1))
            return ImmutableCollectionsMarshal.AsArray(request.ClusterWeight)!;
        var weight = new double[design.Persons];
        for (var p = 0; p < weight.Length; p++) weight[p] = design.PersonWeight[p] * request.ClusterWeight[design.ClusterOf[p]];
        return weight;
    }
}
