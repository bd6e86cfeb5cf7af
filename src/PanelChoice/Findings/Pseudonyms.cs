using System.Collections.Immutable;
using System.Security.Cryptography;
using System.Text;

namespace PanelChoice.Findings;

/// <summary>
/// Stable stand-ins for personal ids in anything meant to be passed on: the same file and id give the same pseudonym. It keeps a reader from
/// recognising somebody at a glance; it is no protection against somebody who holds the data file.
/// </summary>
internal static class Pseudonyms
{
    private const int FewestDigits = 6;

    /// <summary>One pseudonym for each id, all different: the first hexadecimal digits of a hash.</summary>
    /// <param name="dataSha256">Hash of the data file, so that the same id has another pseudonym in another file.</param>
    /// <param name="ids">Distinct ids.</param>
    public static ImmutableArray<string> Of(string dataSha256, ImmutableArray<string> ids)
    {
        var hashes = ids.Select(id => Convert.ToHexStringLower(SHA256.HashData(Encoding.UTF8.GetBytes(dataSha256 + "\n" + id)))).ToArray();
        var digits = FewestDigits;
        while (hashes.Select(h => h[..digits]).Distinct(StringComparer.Ordinal).Count() < hashes.Length) digits++;
        return [.. hashes.Select(h => h[..digits])];
    }
}
