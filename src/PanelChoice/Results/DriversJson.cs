using System.Text.Json;

namespace PanelChoice.Results;

/// <summary>What the result document tells of who drives a term.</summary>
internal static class DriversJson
{
    /// <summary>Degrees of freedom, effective clusters, partial leverage and influence of a parameter.</summary>
    public static void Write(Utf8JsonWriter json, ParameterResult p)
    {
        json.WriteObject("degrees_of_freedom", () =>
        {
            json.WriteFigure("cluster", p.Degrees.Cluster);
            json.WriteFigure("jackknife", p.Degrees.Jackknife);
            json.WriteFigure("two_way", p.Degrees.TwoWay);
            json.WriteFigure("bias_reduced", p.Degrees.BiasReduced);
            json.WriteFigure("bootstrap", p.Degrees.Bootstrap);
        });
        json.WriteFigure("effective_clusters", p.EffectiveClusters);
        if (p.PartialLeverage is { } leverage)
            json.WriteObject("partial_leverage", () =>
            {
                json.WriteFigure("largest", leverage.Largest);
                json.WriteFigure("spread", leverage.Spread);
            });
        else
            json.WriteNull("partial_leverage");
        if (p.Influence is { } influence)
            json.WriteObject("influence", () =>
            {
                json.WriteFigure("largest", influence.Largest);
                json.WriteString("person", influence.Person);
            });
        else
            json.WriteNull("influence");
    }
}
