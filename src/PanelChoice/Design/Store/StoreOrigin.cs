using PanelChoice.Data;
using PanelChoice.Study;

namespace PanelChoice.Design.Store;

/// <summary>What a store was made from; it is refused where this no longer holds.</summary>
/// <param name="Study">Hash of everything in the study that a design depends on.</param>
/// <param name="DataFile">Data file as the study writes it.</param>
/// <param name="DataSha256">Hash of its bytes.</param>
/// <param name="DataStamp">Its size and time.</param>
internal sealed record StoreOrigin(string Study, string DataFile, string DataSha256, FileStamp DataStamp)
{
    /// <summary>Whether a study's data file still is what the store was made from: by size and time, or else by its bytes.</summary>
    public bool IsOf(StudySpecification study)
    {
        var stamp = FileStamp.Of(study);
        if (stamp == DataStamp) return true;
        return stamp.Bytes == DataStamp.Bytes && FileStamp.Sha256Of(study) == DataSha256;
    }

    /// <summary>Writes it.</summary>
    public void Write(BinaryWriter to)
    {
        to.Write(Study);
        to.Write(DataFile);
        to.Write(DataSha256);
        to.Write(DataStamp.Bytes);
        to.Write(DataStamp.Written);
    }

    /// <summary>Reads what <see cref="Write"/> wrote.</summary>
    public static StoreOrigin Read(BinaryReader from) =>
        new(from.ReadString(), from.ReadString(), from.ReadString(), new FileStamp(from.ReadInt64(), from.ReadInt64()));
}
