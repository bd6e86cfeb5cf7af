using System.Text.RegularExpressions;
using PanelChoice.Estimation;
using PanelChoice.Inference;
using PanelChoice.Study;

namespace PanelChoice.Results.Refits;

/// <summary>A folder in which parts are gathered: reads all of them, says of each what is wrong with it, and which are missing.</summary>
/// <param name="folder">The folder as the user named it.</param>
internal sealed partial class PartFolder(string folder)
{
    /// <summary>Stretches of missing parts that a sentence names.</summary>
    private const int MostStretches = 12;

    private readonly List<Problem> problems = [];

    /// <summary>Parts that a problem speaks of already, so that they need not be called missing too.</summary>
    private readonly HashSet<int> told = [];

    /// <summary>The parts, or everything that is wrong with them.</summary>
    public Checked<GatheredParts> Gather()
    {
        var files = Files();
        if (files.Count == 0)
        {
            var what = Directory.Exists(folder) ? "there is no part of an analysis in this folder" : "there is no such folder";
            return Checked<GatheredParts>.Bad(
                [new Problem("parts.not_found", folder, what, "make the parts first, each with 'panelchoice bootstrap STUDY --part I/N --out DIR'")]);
        }

        var read = files.Select(f => (Name: f, File: TryRead(f))).ToList();
        var headers = read.Where(r => r.File?.Header is not null).Select(r => r.File!).ToList();
        var study = headers.Count == 0 ? null : StudyFile(headers[0].Header!);
        var done = headers.Where(f => f is { IsComplete: true, Damage: null } && f.Path.EndsWith(RefitFile.Done, StringComparison.Ordinal))
            .OrderBy(f => f.Header!.Share.Part).ToList();
        var strange = TellSplit(headers);
        foreach (var (name, file) in read)
            if (file is not null && !done.Contains(file) && !strange.Contains(file)) TellUnusable(name, file, study, done);
        Compare(done);
        var parts = headers.Select(f => f.Header!.Share.Parts).Concat(files.Select(f => ShareOf(f)?.Parts ?? 0)).Max();
        if (problems.All(p => p.Id != "parts.split")) TellMissing(parts, done, study);
        if (problems.Count > 0) return Checked<GatheredParts>.Bad([.. problems]);

        var outcomes = new Dictionary<(RefitSeries, int), RefitOutcome>();
        foreach (var refit in done.SelectMany(f => f.Outcomes)) outcomes.Add(refit.Key, refit.Value);
        return Checked<GatheredParts>.Good(new GatheredParts(study!, done[0].Header!.Origin, parts, outcomes));
    }

    private List<string> Files() => !Directory.Exists(folder)
        ? []
        : [.. Directory.EnumerateFiles(folder).Where(f => f.EndsWith(RefitFile.Done, StringComparison.Ordinal) || f.EndsWith(RefitFile.Unfinished, StringComparison.Ordinal))
            .Order(StringComparer.Ordinal)];

    private RefitFile? TryRead(string path)
    {
        try
        {
            return RefitFile.Read(path);
        }
        catch (IOException busy) when (FileLocks.IsTaken(busy))
        {
            Tell("parts.busy", path, ShareOf(path), "another run is at work on this part", "wait until it has ended");
        }
        catch (Exception refused) when (refused is IOException or UnauthorizedAccessException)
        {
            Tell("parts.unreadable", path, ShareOf(path), $"it cannot be read ({refused.Message})", "check that it may be read");
        }

        return null;
    }

    /// <summary>Says what is wrong with a file that is no complete part.</summary>
    private void TellUnusable(string name, RefitFile file, string? study, List<RefitFile> done)
    {
        var share = file.Header?.Share ?? ShareOf(name);
        if (file.Foreign is { } reason)
        {
            Tell("parts.foreign", name, share, reason, "move it out of the folder");
            return;
        }

        var again = share is null ? "make its part again" : $"run {Command(share, study)}";
        if (name.EndsWith(RefitFile.Done, StringComparison.Ordinal))
        {
            Tell("parts.damaged", name, share, $"the file is damaged: {file.Damage ?? "it has no end"}", $"delete it and {again}");
            return;
        }

        // What a run left behind beside the complete part does no harm.
        if (done.Any(d => d.Header!.Share == share)) return;
        var (have, need) = (file.Outcomes.Count, file.Header is { } h ? h.Replicates + h.Deletions : 0);
        var what = file.Header is null ? "the part was begun, but holds nothing yet" : $"the part is not finished: {have} of its {need} refits are done";
        Tell("parts.unfinished", name, share, what, $"{again}, which goes on from there");
    }

    /// <summary>Says where parts, finished or not, come from divisions into different numbers, and gives those of another division than most.</summary>
    private List<RefitFile> TellSplit(List<RefitFile> files)
    {
        if (files.Count == 0) return [];
        var first = files.GroupBy(f => f.Header!.Share.Parts).OrderByDescending(g => g.Count()).First().First();
        var strange = files.Where(f => f.Header!.Share.Parts != first.Header!.Share.Parts).ToList();
        foreach (var file in strange.Take(1))
            problems.Add(new Problem(
                "parts.split", file.Path,
                $"it is one of {file.Header!.Share.Parts} parts, but {Path.GetFileName(first.Path)} is one of {first.Header!.Share.Parts}",
                "keep the parts of one division in the folder and move the others away"));
        return strange;
    }

    /// <summary>Compares complete parts with the first one.</summary>
    private void Compare(List<RefitFile> done)
    {
        if (done.Count == 0) return;
        var (first, name) = (done[0].Header!, Path.GetFileName(done[0].Path));
        foreach (var same in done.GroupBy(f => f.Header!.Share).Where(g => g.Count() > 1))
            problems.Add(new Problem(
                "parts.duplicate", same.ElementAt(1).Path, $"it holds part {same.Key.Part} of {same.Key.Parts}, as {Path.GetFileName(same.First().Path)} does",
                "keep one of the two"));
        var others = done.Select(f => (File: f, Difference: first.Origin.Against(f.Header!.Origin))).Where(d => d.Difference is not null);
        foreach (var kind in others.GroupBy(d => d.Difference!.What))
        {
            var (file, difference) = kind.First();
            var more = kind.Count() > 1 ? $"; so does every one of {kind.Count() - 1} more" : "";
            problems.Add(new Problem(
                "parts.other_origin", file.Path, $"compared with {name}, it was made from something else and differs in {difference!.Words}{more}", difference.Remedy));
        }
    }

    private void TellMissing(int parts, List<RefitFile> done, string? study)
    {
        var there = done.Select(f => f.Header!.Share.Part).Concat(told).ToHashSet();
        var missing = Enumerable.Range(1, parts).Where(p => !there.Contains(p)).ToList();
        if (missing.Count == 0) return;
        var command = Command(new RefitShare(missing[0], parts), study);
        problems.Add(new Problem(
            "parts.missing", folder,
            missing.Count == 1 ? $"part {missing[0]} of {parts} is missing" : $"parts {Stretches(missing)} of {parts} are missing",
            missing.Count == 1 ? $"run {command}" : $"run {command}, and the same for the others"));
    }

    private void Tell(string id, string file, RefitShare? share, string what, string remedy)
    {
        problems.Add(new Problem(id, file, what, remedy));
        if (share is not null) told.Add(share.Part);
    }

    /// <summary>The study file of a part, as a path that a command in the present folder understands.</summary>
    private string StudyFile(RefitHeader header)
    {
        var full = Path.GetFullPath(Path.Combine(Path.GetFullPath(folder), header.StudyFile));
        return Path.IsPathRooted(folder) ? full : Path.GetRelativePath(".", full);
    }

    private string Command(RefitShare share, string? study) =>
        $"'panelchoice bootstrap {study ?? "STUDY"} --part {share.Part}/{share.Parts} --out {folder}'";

    private static RefitShare? ShareOf(string path)
    {
        var match = PartName().Match(Path.GetFileName(path));
        return match.Success ? RefitShare.Parse($"{match.Groups[1].Value}/{match.Groups[2].Value}") : null;
    }

    /// <summary>Numbers in order, runs of them as "3 to 7".</summary>
    private static string Stretches(List<int> numbers)
    {
        var stretches = new List<string>();
        for (int i = 0, j; i < numbers.Count; i = j)
        {
            for (j = i + 1; j < numbers.Count && numbers[j] == numbers[j - 1] + 1;) j++;
            stretches.Add(j - i == 1 ? $"{numbers[i]}" : j - i == 2 ? $"{numbers[i]}, {numbers[i + 1]}" : $"{numbers[i]} to {numbers[j - 1]}");
        }

        return stretches.Count <= MostStretches
            ? string.Join(", ", stretches)
            : string.Join(", ", stretches.Take(MostStretches)) + $" and others, {numbers.Count} in all,";
    }

    [GeneratedRegex(@"^part-(\d{1,6})-of-(\d{1,6})\.")]
    private static partial Regex PartName();
}
