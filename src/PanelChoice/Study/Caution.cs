namespace PanelChoice.Study;

/// <summary>A caution that goes with a result: a stable id and one sentence.</summary>
/// <param name="Id">Stable id, for example <c>history.gaps</c>.</param>
/// <param name="Sentence">The caution in plain words.</param>
public sealed record Caution(string Id, string Sentence);
