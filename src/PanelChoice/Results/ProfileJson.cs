using System.Runtime.InteropServices;
using System.Text.Json;
using PanelChoice.Covariates;
using PanelChoice.Panels;
using PanelChoice.Study;

namespace PanelChoice.Results;

/// <summary>The panel's profile as a document, for machines; written like the result document.</summary>
public static class ProfileJson
{
    /// <summary>Name and version of the document's layout.</summary>
    public const string Schema = "panelchoice-profile/1";

    /// <summary>Writes the document, whole or not at all.</summary>
    /// <param name="study">The study.</param>
    /// <param name="profile">The profile of its panel.</param>
    /// <param name="covariates">Covariates on the estimation sample.</param>
    /// <param name="path">The file to make or replace; its folder must exist.</param>
    /// <exception cref="IOException">It cannot be written.</exception>
    /// <exception cref="UnauthorizedAccessException">It may not be written.</exception>
    public static void Write(StudySpecification study, PanelProfile profile, CovariateSet covariates, string path)
    {
        ArgumentNullException.ThrowIfNull(study);
        ArgumentNullException.ThrowIfNull(profile);
        ArgumentNullException.ThrowIfNull(covariates);
        AtomicFile.Write(path, stream =>
        {
            using (var json = new Utf8JsonWriter(stream, ResultJson.Options))
                json.WriteObject(() => WriteDocument(json, study, profile, covariates));
            stream.WriteByte((byte)'\n');
        });
    }

    private static void WriteDocument(Utf8JsonWriter json, StudySpecification study, PanelProfile profile, CovariateSet covariates)
    {
        json.WriteString("schema", Schema);
        json.WriteString("title", study.Title);
        json.WriteObject("tool", () =>
        {
            json.WriteString("version", ResultBuilder.Version);
            json.WriteString("runtime", RuntimeInformation.FrameworkDescription);
        });
        ResultJson.WriteInputs(json, ResultBuilder.Inputs(study, profile.File, covariates.Panel.Table.Sha256));
        ResultJson.WriteWarnings(json, profile.Cautions.Concat(covariates.Cautions).Select(c => new ResultWarning(c.Id, c.Sentence)).Distinct());
        json.WriteObject("panel", () => WritePanel(json, profile, covariates.Panel));
        ResultJson.WriteSample(json, SampleSummary.Of(EstimationSample.Of(covariates)));
    }

    private static void WritePanel(Utf8JsonWriter json, PanelProfile profile, ChoicePanel panel)
    {
        json.WriteNumber("rows", profile.Rows);
        json.WriteNumber("persons", profile.Persons);
        json.WriteNumber("occasions", profile.Occasions);
        json.WriteString("first_occasion", profile.FirstOccasion);
        json.WriteString("last_occasion", profile.LastOccasion);
        WriteSpread(json, "occasions_per_person", profile.OccasionsPerPerson);
        WriteSpread(json, "offered_alternatives", profile.OfferedAlternatives);
        json.WriteNumber("single_alternative_occasions", profile.SingleAlternativeOccasions);
        if (profile.Gaps is { } gaps)
            json.WriteObject("gaps", () =>
            {
                json.WriteString("unit", gaps.Unit == OccasionUnit.WholeNumber ? "step" : gaps.Unit.ToString().ToLowerInvariant());
                json.WriteNumber("step", gaps.Step);
                json.WriteNumber("count", gaps.Count);
                json.WriteNumber("persons", gaps.PersonsWithGaps);
                json.WriteNumber("longest", gaps.Longest);
            });
        else
            json.WriteNull("gaps");
        json.WriteArray("alternatives", profile.Alternatives, a => json.WriteObject(() =>
        {
            json.WriteString("name", a.Name);
            json.WriteNumber("offered", a.Offered);
            json.WriteNumber("chosen", a.Chosen);
            json.WriteFigure("offered_share", a.OfferedShare);
            json.WriteFigure("chosen_share", a.ChosenShare);
            json.WriteFigure("chosen_where_offered", a.ChosenWhereOffered);
            json.WriteNumber("persons_choosing", a.PersonsChoosing);
        }));
        json.WriteNumber("persons_with_several_occasions", profile.PersonsWithSeveralOccasions);
        json.WriteNumber("persons_never_switching", profile.PersonsNeverSwitching);
        if (profile.LastChoice is { } last)
            json.WriteObject("last_choice", () =>
            {
                json.WriteString("rule", last.Rule.ToString().ToLowerInvariant());
                json.WriteNumber("occasions", last.Occasions);
                json.WriteNumber("repeated", last.Repeated);
                json.WriteFigure("repeated_share", last.RepeatedShare);
                json.WriteNumber("not_offered_now", last.NotOfferedNow);
                json.WriteArray("order", panel.Alternatives, json.WriteStringValue);
                json.WriteArray("transitions", last.Transitions, row => json.WriteRow([.. row.Select(n => (double)n)]));
            });
        else
            json.WriteNull("last_choice");
        if (profile.Weights is { } weights)
            json.WriteObject("weights", () =>
            {
                json.WriteString("column", weights.Column);
                json.WriteFigure("smallest", weights.Smallest);
                json.WriteFigure("mean", weights.Mean);
                json.WriteFigure("largest", weights.Largest);
            });
        else
            json.WriteNull("weights");
        json.WriteObject("clusters", () =>
        {
            json.WriteString("by", profile.Clusters.By);
            json.WriteNumber("count", profile.Clusters.Count);
            WriteSpread(json, "occasions", profile.Clusters.Occasions);
        });
    }

    private static void WriteSpread(Utf8JsonWriter json, string name, Spread spread) => json.WriteObject(name, () =>
    {
        json.WriteNumber("smallest", spread.Smallest);
        json.WriteFigure("median", spread.Median);
        json.WriteNumber("largest", spread.Largest);
    });
}
