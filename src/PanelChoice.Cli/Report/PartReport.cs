using System.Globalization;
using PanelChoice.Study;

namespace PanelChoice.Cli.Report;

/// <summary>What an analyst reads after a part was made.</summary>
internal static class PartReport
{
    /// <summary>Puts the report together.</summary>
    /// <param name="study">The study.</param>
    /// <param name="part">The part.</param>
    /// <param name="folder">The folder of the parts.</param>
    public static Letter Of(StudySpecification study, PanelAnalysisPart part, string folder)
    {
        var (share, plan) = (part.Share, part.Plan);
        var name = Path.GetFileName(study.File);
        var letter = new Letter().Title(study.Title.Length > 0 ? study.Title : name).Subtitle($"study {name}, part {share.Part} of {share.Parts}").Gap();
        if (plan.Obstacle is { } obstacle) letter.Paragraph($"There is nothing to refit: {obstacle} The gathered result will say so.");
        else if (plan.Replicates + plan.Deletions == 0) letter.Paragraph("The study asks for no bootstrap and no refits of a jackknife, so that the part is empty.");
        else letter.Paragraph(Content(part));
        letter.Gap();
        letter.Paragraph($"{(part.WasComplete ? "It was complete already" : "Written to")}{(part.WasComplete ? ": " : " ")}{part.File}.");
        letter.Paragraph(share.Parts == 1 ? "This makes the result of it:" : $"When all {share.Parts} parts are there, this joins them:");
        letter.Paragraph($"panelchoice gather {folder}");
        return letter;
    }

    private static string Content(PanelAnalysisPart part)
    {
        var (share, plan) = (part.Share, part.Plan);
        var (replicates, deletions) = (share.Count(plan.Replicates), share.Count(plan.Deletions));
        var first = share.First(plan.Replicates);
        var numbers = replicates == 0 ? "" : replicates == 1 ? $" (number {first})" : $" (numbers {first} to {first + replicates - 1})";
        var text = $"The part holds {Number(replicates)} of {Number(plan.Replicates)} bootstrap replicates{numbers}"
            + (plan.Deletions == 0 ? "." : $" and {Number(deletions)} of {Number(plan.Deletions)} refits that leave one cluster out.");
        return part.Found == 0 || part.WasComplete ? text : text + $" {Number(part.Found)} of these refits were there from an earlier run.";
    }

    private static string Number(int n) => n.ToString("#,0", CultureInfo.InvariantCulture);
}
