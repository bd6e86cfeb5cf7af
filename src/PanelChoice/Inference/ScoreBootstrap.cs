using PanelChoice.Study;

namespace PanelChoice.Inference;

/// <summary>The score bootstrap.</summary>
internal static class ScoreBootstrap
{
    /// <summary>Draws asked for by the settings.</summary>
    public static int DrawsOf(InferenceInput input, InferenceSettings settings) => 0;
}
