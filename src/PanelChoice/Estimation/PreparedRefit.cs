using System.Collections.Immutable;

namespace PanelChoice.Estimation;

/// <summary>A request with what every way of refitting needs.</summary>
/// <param name="Request">The request.</param>
/// <param name="Active">Parameters that move, ascending.</param>
/// <param name="PersonWeight">Weight of each person: sampling weight times that of the cluster.</param>
/// <param name="Start">All K parameters to start from, fixed ones at their values.</param>
internal sealed record PreparedRefit(RefitRequest Request, ImmutableArray<int> Active, double[] PersonWeight, double[] Start)
{
    /// <summary>Prepares a request.</summary>
    /// <param name="model">The model.</param>
    /// <param name="request">The request.</param>
    public static PreparedRefit Of(FittedModel model, RefitRequest request)
    {
        var design = model.Design;
        var weight = new double[design.Persons];
        for (var p = 0; p < weight.Length; p++) weight[p] = design.PersonWeight[p] * request.ClusterWeight[design.ClusterOf[p]];
        var start = request.Start.ToArray();
        for (var k = 0; k < start.Length; k++) start[k] = model.Layout.Parameters[k].Fixed ?? start[k];
        return new PreparedRefit(request, [.. model.Layout.Free.Except(model.Held).Except(request.Held)], weight, start);
    }
}
