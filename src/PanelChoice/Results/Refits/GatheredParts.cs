using System.Collections.Immutable;
using PanelChoice.Estimation;
using PanelChoice.Inference;
using PanelChoice.Study;

namespace PanelChoice.Results.Refits;

/// <summary>All parts of one analysis: each whole, all of one origin, none missing. A journal of every numbered refit that it needs.</summary>
public sealed class GatheredParts : IRefitJournal
{
    private readonly Dictionary<(RefitSeries Series, int Number), RefitOutcome> outcomes;

    internal GatheredParts(string studyFile, RefitOrigin origin, int parts, Dictionary<(RefitSeries, int), RefitOutcome> outcomes)
    {
        (StudyFile, Origin, Parts) = (studyFile, origin, parts);
        this.outcomes = outcomes;
    }

    /// <summary>The study file that they were made from, where the first part saw it from the folder.</summary>
    public string StudyFile { get; }

    /// <summary>What all refits depend on.</summary>
    public RefitOrigin Origin { get; }

    /// <summary>Number of parts.</summary>
    public int Parts { get; }

    /// <summary>Names of the files that a part may have in its folder: while it is made, and when it is done.</summary>
    /// <param name="share">Which part.</param>
    public static IReadOnlyList<string> NamesOf(RefitShare share)
    {
        ArgumentNullException.ThrowIfNull(share);
        return [RefitFile.NameOf(share, RefitFile.Unfinished), RefitFile.NameOf(share, RefitFile.Done)];
    }

    /// <summary>Reads the parts in a folder and checks them against each other.</summary>
    /// <param name="folder">The folder.</param>
    /// <returns>The parts, or everything that is wrong with them; what is missing is told under the ids parts.not_found and parts.missing.</returns>
    public static Checked<GatheredParts> Read(string folder)
    {
        ArgumentException.ThrowIfNullOrWhiteSpace(folder);
        return new PartFolder(folder).Gather();
    }

    /// <inheritdoc/>
    public RefitOutcome? Find(RefitSeries series, int number) => outcomes.GetValueOrDefault((series, number));

    /// <inheritdoc/>
    /// <exception cref="InvalidOperationException">Always: the parts are complete.</exception>
    public void Keep(RefitSeries series, ImmutableArray<int> numbers, ImmutableArray<RefitOutcome> outcomes) =>
        throw new InvalidOperationException("A refit was made that no part holds, although the parts are complete.");

    /// <summary>Why these parts do not belong to an analysis; null when they do.</summary>
    /// <param name="study">Its study.</param>
    /// <param name="here">What its refits depend on.</param>
    internal Problem? Against(StudySpecification study, RefitOrigin here) => here.Against(Origin) is { } difference
        ? new Problem("parts.other_origin", study.File, $"the parts were made from something else and differ in {difference.Words}", difference.Remedy)
        : null;

    /// <summary>Why the study at hand is not the one that the parts were made from; null when it is. Told before its data are read.</summary>
    /// <param name="study">The study.</param>
    internal Problem? Against(StudySpecification study) => Against(study, Origin with { Study = study.Sha256 });

    /// <summary>Why the data at hand are not those that the parts were made from; null when they are. Told before the fit.</summary>
    /// <param name="study">The study.</param>
    /// <param name="dataSha256">SHA-256 of its data.</param>
    internal Problem? Against(StudySpecification study, string dataSha256) => Against(study, Origin with { Study = study.Sha256, Data = dataSha256 });
}
