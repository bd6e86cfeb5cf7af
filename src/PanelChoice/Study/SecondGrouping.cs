namespace PanelChoice.Study;

/// <summary>What the second grouping of two-way clustering goes by.</summary>
internal enum SecondGroupingKind
{
    /// <summary>The occasion: everybody's same day.</summary>
    Occasion,

    /// <summary>The person, where the first clusters are larger.</summary>
    Person,

    /// <summary>A column of the data.</summary>
    Column,
}

/// <summary>The second grouping of two-way clustering, whichever name the study gives it.</summary>
/// <param name="Kind">What it goes by.</param>
/// <param name="By">What it is called in results.</param>
/// <param name="Column">The column to read; null where occasions or persons are the groups.</param>
internal sealed record SecondGrouping(SecondGroupingKind Kind, string By, string? Column)
{
    /// <summary>
    /// The grouping that a study asks for; null where it asks for none. The words "occasion" and "person" stand for the panel's own, whatever columns the data
    /// have, and so do the names of these two columns.
    /// </summary>
    public static SecondGrouping? Of(StudySpecification study) => Of(study.Inference, study.Panel);

    /// <summary>The same from two parts of a study.</summary>
    public static SecondGrouping? Of(InferenceSettings inference, PanelSource panel)
    {
        if (inference.SecondCluster is not { } name) return null;
        if (name == "occasion" || name == panel.Occasion) return new SecondGrouping(SecondGroupingKind.Occasion, "occasion", null);
        if (name == "person" || name == panel.Person) return new SecondGrouping(SecondGroupingKind.Person, "person", null);
        return new SecondGrouping(SecondGroupingKind.Column, name, name);
    }
}
