using System.Globalization;
using PanelChoice.Results;
using PanelChoice.Study;

namespace PanelChoice.Cli.Report;

/// <summary>What an analyst reads after a store was made, or found to be whole.</summary>
internal static class StoreReport
{
    /// <summary>Puts the report together.</summary>
    /// <param name="study">The study.</param>
    /// <param name="sample">The sample in the store.</param>
    /// <param name="store">The store's file.</param>
    public static Letter Of(StudySpecification study, PanelAnalysisSample sample, string store)
    {
        var name = Path.GetFileName(study.File);
        var letter = new Letter().Title(study.Title.Length > 0 ? study.Title : name).Subtitle($"study {name}, data {study.Panel.File}");
        letter.Heading("Who is in it");
        SampleSection.AddTo(letter, SampleSummary.Of(sample.Sample));
        foreach (var caution in sample.Sample.Cautions) letter.Gap().Paragraph(caution.Sentence);
        var megabytes = (new FileInfo(store).Length / 1e6).ToString("#,0.0", CultureInfo.InvariantCulture);
        letter.Gap().Paragraph($"The built design is in {store}, {megabytes} MB. This reads it:");
        letter.Paragraph($"panelchoice estimate {study.File} --store {store}");
        return letter;
    }
}
