using PanelChoice.Findings;
using PanelChoice.Results;

namespace PanelChoice.Cli.Report;

/// <summary>What an analyst reads after an estimation, from top to bottom.</summary>
internal static class EstimateReport
{
    /// <summary>Puts the report together.</summary>
    /// <param name="result">The result.</param>
    public static Letter Of(AnalysisResult result)
    {
        var letter = new Letter()
            .Title(result.Title.Length > 0 ? result.Title : result.Inputs.Study.File)
            .Subtitle($"study {result.Inputs.Study.File}, data {result.Inputs.Data.File}");
        letter.Heading("Who is in it");
        SampleSection.AddTo(letter, result.Sample);
        Say(letter, result, FindingTopic.Sample, gapFirst: true);
        letter.Heading("The fit");
        FitSection.AddTo(letter, result);
        TermsSection.AddTo(letter, result);
        TwoWaySection.AddTo(letter, result);
        TestsSection.AddTo(letter, result);
        DriversSection.AddTo(letter, result);
        letter.Heading("What the past does");
        Say(letter, result, FindingTopic.Past);
        letter.Heading("Which alternatives replace which");
        Say(letter, result, FindingTopic.Nests);
        letter.Heading("Does independence hold?");
        Say(letter, result, FindingTopic.Independence);
        IndependenceSection.AddTo(letter, result);
        letter.Heading("What to report");
        Say(letter, result, FindingTopic.Advice);
        letter.Heading("Cautions");
        Say(letter, result, FindingTopic.Caution);
        letter.Heading("Where the figures come from");
        letter.Paragraph(
            $"panelchoice {result.Tool.Version} on {result.Tool.Runtime}, kernel {result.Tool.Kernel}; seeds: starts {result.Settings.EstimateSeed}, "
            + $"bootstrap {result.Settings.BootstrapSeed}, diagnostics {result.Settings.DiagnosticsSeed}; SHA-256 of the study begins "
            + $"{result.Inputs.Study.Sha256[..12]}, of the data {result.Inputs.Data.Sha256[..12]}.");
        return letter;
    }

    /// <summary>The findings of a topic, a paragraph each.</summary>
    public static void Say(Letter letter, AnalysisResult result, FindingTopic topic, bool gapFirst = false)
    {
        var findings = result.Findings.Where(f => f.Topic == topic).ToList();
        if (findings.Count == 0)
        {
            if (!gapFirst) letter.Paragraph("Nothing can be said here: the estimate is not to be trusted.");
            return;
        }

        if (gapFirst) letter.Gap();
        letter.Paragraphs(findings.Select(f => (f.Sentence, f.Severity == FindingSeverity.Warning)));
    }
}
