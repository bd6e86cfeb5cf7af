using PanelChoice.Design;

namespace PanelChoice.Tests.Support;

/// <summary>Single cells of a design, by situation.</summary>
internal static class DesignCells
{
    public static bool IsOffered(this ChoiceDesign design, int situation, int alternative)
    {
        var reader = ReaderAt(design, situation);
        return reader.IsOffered(situation - reader.Block!.FirstSituation, alternative);
    }

    public static int ChosenAt(this ChoiceDesign design, int situation)
    {
        var reader = ReaderAt(design, situation);
        return reader.ChosenAt(situation - reader.Block!.FirstSituation);
    }

    public static double Value(this ChoiceDesign design, int situation, DesignColumn column)
    {
        var reader = ReaderAt(design, situation);
        return reader.Value(column.Storage, situation - reader.Block!.FirstSituation);
    }

    private static BlockReader ReaderAt(ChoiceDesign design, int situation)
    {
        var reader = design.Store.Reader();
        reader.Open(design.Blocks[design.BlockOf[situation]]);
        return reader;
    }
}
