using System.Collections.Immutable;
using PanelChoice.Data;
using PanelChoice.Study;

namespace PanelChoice.Panels;

/// <summary>
/// A recorded panel in parts of whole persons, in the panel's order: one part where its table is small or has to be held as a whole, otherwise as
/// many as the file gives. A part is a <see cref="ChoicePanel"/> of its persons whose alternatives, text values and clusters are those of the whole panel
/// (where persons are the clusters, its own persons).
/// </summary>
internal sealed class PanelParts
{
    private readonly StudySpecification study;
    private readonly TableScan scan;
    private readonly ClusterNames? clusters;
    private readonly int rowsOfPart;
    private bool isChecked;

    private PanelParts(StudySpecification study, TableScan scan, int rowsOfPart)
    {
        this.study = study;
        this.scan = scan;
        this.rowsOfPart = rowsOfPart;
        clusters = ClusterNames.Of(study, scan.Outline);
    }

    /// <summary>What is known of the file as a whole.</summary>
    public TableOutline Outline => scan.Outline;

    /// <summary>Size and time of the file.</summary>
    public FileStamp Stamp => scan.Stamp;

    /// <summary>Names of the clusters of the whole panel, in order.</summary>
    public ImmutableArray<string> Clusters => clusters?.Names ?? Outline.Persons;

    /// <summary>Whether persons are the clusters.</summary>
    public bool ClustersArePersons => clusters is null;

    /// <summary>The parts of a file that was read once; problems where the study and the file do not fit. Rows are checked at the first visit.</summary>
    /// <param name="study">The study.</param>
    /// <param name="scan">Its file, read once.</param>
    /// <param name="rowsOfPart">Rows of a part, unless a person has more.</param>
    public static Checked<PanelParts> Of(StudySpecification study, TableScan scan, int rowsOfPart = TableScan.RowsOfPart) =>
        ChoicePanelBuilder.TooMany(study, scan.Outline.File, scan.Outline.Alternatives) is { } many
            ? Checked<PanelParts>.Bad([many])
            : Checked<PanelParts>.Good(new PanelParts(study, scan, rowsOfPart));

    /// <summary>Hands out the parts in order. The first visit checks every row, and after a problem hands out no further part.</summary>
    /// <param name="each">Gets each part, and the place of its first person in the panel.</param>
    /// <param name="mayEndWith">Whether a part may end with a person, by place in the panel; null for any.</param>
    /// <returns>All problems, empty where there are none.</returns>
    public ImmutableArray<Problem> Visit(Action<ChoicePanel, int> each, Func<int, bool>? mayEndWith = null)
    {
        var problems = new ProblemList();
        if (!isChecked) StudyFit.Check(study, Outline.Alternatives, Outline.OccasionKind, problems);
        var unreadable = scan.Visit(rowsOfPart, mayEndWith ?? (_ => true), (table, first) =>
        {
            // The persons of a whole table may stand in any order; those of a part stand in the panel's.
            var order = table.Person.Levels.Length == Outline.Persons.Length ? NameOrder.Of(table.Person.Levels) : [.. Enumerable.Range(0, table.Person.Levels.Length)];
            if (ChoicePanelBuilder.Build(study, table, order, clusters, problems) is { } part) each(part, first);
        });
        if (!unreadable.IsEmpty) return unreadable;
        isChecked = problems.IsEmpty;
        return ProblemList.InRowOrder(problems);
    }
}
