using PanelChoice.Design;

namespace PanelChoice.Estimation;

/// <summary>
/// A part of a large sample on which questions can be asked first: every so-manieth block of persons, because a pass costs nothing only for a
/// block in which every weight is 0.
/// </summary>
internal static class ThinnedSample
{
    /// <summary>Persons it keeps at least (about; measured: fewer lose more in steps on the whole sample than they save).</summary>
    private const int Persons = 600;

    /// <summary>The design's person weights, 0 outside the part; null where a part would be more than a quarter, too much for it to be worth while.</summary>
    public static double[]? Weights(ChoiceDesign design) => Every(design) < 4 ? null : WeightsOrAll(design);

    /// <summary>The same, but whatever part there is: all persons of a small sample.</summary>
    public static double[] WeightsOrAll(ChoiceDesign design)
    {
        var every = Every(design);
        var weights = new double[design.Persons];
        for (var b = 0; b < design.Blocks.Length; b += every)
        {
            var block = design.Blocks[b];
            var end = block.FirstSituation + block.Situations;
            for (var p = design.PersonOf[block.FirstSituation]; p < design.Persons && design.PersonStart[p] < end; p++) weights[p] = design.PersonWeight[p];
        }

        return weights;
    }

    private static int Every(ChoiceDesign design) => Math.Clamp(design.Persons / Persons, 1, 16);
}
