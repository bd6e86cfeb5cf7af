using System.Text.Json;
using PanelChoice.Estimation;

namespace PanelChoice.Results;

/// <summary>Nests against utility maximisation in <c>result.json</c>.</summary>
internal static class UtilityJson
{
    /// <summary>Writes down why figures are null.</summary>
    public static void NoteReasons(IReadOnlyList<NestConsistency> nests, ReasonBook book)
    {
        for (var i = 0; i < nests.Count; i++)
            if (nests[i].Reason is { } reason) book.Note($"utility_maximisation[{i}].locally", reason);
    }

    public static void Write(Utf8JsonWriter json, NestConsistency nest)
    {
        json.WriteString("nest", nest.Nest);
        json.WriteFigure("estimate", nest.Estimate);
        json.WriteFigure("bound", nest.Bound);
        json.WriteBoolean("globally", nest.Globally);
        if (nest.Locally is { } locally)
            json.WriteObject("locally", () =>
            {
                json.WriteFigure("share", locally.Share);
                json.WriteNumber("occasions", locally.Occasions);
            });
        else
            json.WriteNull("locally");
    }
}
