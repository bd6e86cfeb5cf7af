using System.Security.Cryptography;
using System.Text;
using PanelChoice.Study;
using Xunit;

namespace PanelChoice.Tests.Study;

public class CompleteStudyTests
{
    private const string Crossing = """
        title = "Marrowick crossing, spring wave"

        [panel]
        file        = "crossing.csv"      # .csv, .csv.gz, .parquet
        layout      = "long"
        person      = "commuter"
        occasion    = "day"
        alternative = "mode"
        chosen      = "taken"
        offered     = "running"
        weight      = "expansion"
        shared_calendar = true

        [history]
        previous        = "workday"
        holidays        = ["2031-04-14", 2031-04-17]
        without_history = "drop"

        [[nest]]
        name    = "river"
        members = ["ferry", "hydrofoil"]
        dissimilarity = 0.6

        [[nest]]
        name    = "road"
        members = ["drive", "rail"]

        [[nest]]
        name    = "rail"
        members = ["tram"]
        same_as = "road"

        [[term]]
        name   = "journey time"
        column = "minutes"

        [[term]]
        name   = "constant"
        constant = true
        each     = true
        base     = "drive"

        [[term]]
        name         = "fare"
        column       = "fare"
        alternatives = ["tram", "ferry", "hydrofoil"]

        [[term]]
        name   = "season ticket"
        column = "ticket"
        each   = true
        base   = "drive"

        [[term]]
        name   = "last delay"
        column = "delay"
        lag    = 1

        [[term]]
        name        = "same as last time"
        last_choice = 1

        [[term]]
        name   = "Monday"
        column = "weekday"
        is     = "Mon"
        each   = true
        base   = "drive"

        [estimate]
        form   = "utility-scaled"
        starts = 20
        seed   = 7

        [inference]
        cluster        = "person"
        confidence     = 0.95
        jackknife      = "auto"
        [inference.bootstrap]
        replicates = 399
        blocks     = "cluster"
        seed       = 7

        [diagnostics]
        lags  = 5
        level = 0.05
        draws = 9999
        seed  = 7
        """;

    [Fact]
    public void A_complete_study_is_read_as_written()
    {
        var study = StudyText.Good(Crossing);
        Assert.Equal("Marrowick crossing, spring wave", study.Title);
        Assert.Equal(Crossing, study.Text);
        Assert.Equal(Convert.ToHexStringLower(SHA256.HashData(Encoding.UTF8.GetBytes(Crossing))), study.Sha256);
        Assert.EndsWith("study.toml", study.File, StringComparison.Ordinal);
        Assert.Equal(Path.Combine(Path.GetDirectoryName(study.File)!, "crossing.csv"), study.Panel.FullPath);
        Assert.Equal(
            new PanelSource("crossing.csv", study.Panel.FullPath, "commuter", "day", "mode", "taken", "running", "expansion", true), study.Panel);
        Assert.Equal(PreviousRule.Workday, study.History.Previous);
        Assert.Equal([new DateOnly(2031, 4, 14), new DateOnly(2031, 4, 17)], study.History.Holidays.AsEnumerable());
        Assert.Equal(MissingHistory.Drop, study.History.WithoutHistory);

        Assert.Equal(["river", "road", "rail"], study.Nests.Select(n => n.Name));
        Assert.Equal(["ferry", "hydrofoil"], study.Nests[0].Members.AsEnumerable());
        Assert.Equal([0.6, null, null], study.Nests.Select(n => n.Dissimilarity));
        Assert.Equal([null, null, "road"], study.Nests.Select(n => n.SameAs));
        Assert.Equal([19, 24, 28], study.Nests.Select(n => n.Line));

        Assert.Equal(["journey time", "constant", "fare", "season ticket", "last delay", "same as last time", "Monday"], study.Terms.Select(t => t.Name));
        Assert.Equal(
            [
                new ColumnSource("minutes", new Now(), null, false, null), new ConstantSource(), new ColumnSource("fare", new Now(), null, false, null),
                new ColumnSource("ticket", new Now(), null, false, null), new ColumnSource("delay", new Lag(1), null, false, null),
                new LastChoiceSource(1), new ColumnSource("weekday", new Now(), "Mon", false, null),
            ],
            study.Terms.Select(t => t.Source));
        Assert.Equal([null, "drive", null, "drive", null, null, "drive"], study.Terms.Select(t => t.Base));
        Assert.Equal([false, true, false, true, false, false, true], study.Terms.Select(t => t.Each));
        Assert.Equal(["tram", "ferry", "hydrofoil"], study.Terms[2].Alternatives.AsEnumerable());
        Assert.Equal(33, study.Terms[0].Line);

        Assert.Equal(new EstimateSettings(NestedLogitForm.UtilityScaled, 20, 7), study.Estimate);
        Assert.Equal(new InferenceSettings("person", 0.95, JackknifeKind.Auto, 399, 7), study.Inference);
        Assert.Equal(new DiagnosticsSettings(5, 0.05, 9999, 7), study.Diagnostics);
    }

    [Fact]
    public void What_is_left_out_has_its_default()
    {
        var study = StudyText.Good(StudyText.Small);
        Assert.Equal("", study.Title);
        Assert.Equal((null, null, null), (study.Panel.Offered, study.Panel.Weight, study.Panel.SharedCalendar));
        Assert.Equal(new HistorySpecification(null, [], null, MissingHistory.Drop), study.History with { Holidays = [] });
        Assert.Empty(study.Nests);
        Assert.Equal(new EstimateSettings(NestedLogitForm.UtilityScaled, 20, 7), study.Estimate);
        Assert.Equal(new InferenceSettings("person", 0.95, JackknifeKind.Auto, 399, 7), study.Inference);
        Assert.Equal(new DiagnosticsSettings(5, 0.05, 9999, 7), study.Diagnostics);
        var term = Assert.Single(study.Terms);
        Assert.Equal(
            (false, null, null, false, 1.0, null, null), (term.Each, term.Base, term.Times, term.Log, term.Scale, term.Fixed, term.Start));
    }

    [Fact]
    public void A_panel_with_one_occasion_for_each_person_needs_no_occasion_column() =>
        Assert.Null(StudyText.Good(StudyText.Small.Replace("occasion = \"day\"\n", "", StringComparison.Ordinal)).Panel.Occasion);

    [Fact]
    public void A_byte_order_mark_and_carriage_returns_change_nothing()
    {
        var read = StudyText.ReadBytes([.. Encoding.UTF8.Preamble, .. Encoding.UTF8.GetBytes(Crossing.Replace("\n", "\r\n", StringComparison.Ordinal))]);
        var plain = StudyText.Good(Crossing);
        Assert.Equal(plain.Title, read.Value!.Title);
        Assert.Equal(plain.Terms.Select(t => (t.Name, t.Source, t.Line)), read.Value.Terms.Select(t => (t.Name, t.Source, t.Line)));
        Assert.Equal(plain.Diagnostics, read.Value.Diagnostics);
    }

    [Theory]
    [InlineData(1)]
    [InlineData(2)]
    public void A_damaged_study_is_a_list_of_problems_or_a_study_but_never_an_exception(int seed)
    {
        const string Signs = "[]{}=\"'.,# \n\\10-+eTx\t";
        for (var i = 0; i < 250; i++)
        {
            var random = new PanelChoice.Numerics.CounterRandom(seed, "damaged study", i);
            var text = new StringBuilder(Crossing);
            for (var edits = random.Next(6); edits >= 0; edits--)
            {
                var at = random.Next(text.Length - 20);
                if (random.Next(2) == 0) text.Remove(at, 1 + random.Next(20));
                else text.Insert(at, Signs[random.Next(Signs.Length)]);
            }

            var read = StudyText.Read(text.ToString());
            Assert.Equal(read.Value is null, read.Problems.Length > 0);
            Assert.All(read.Problems, p => Assert.True(p.Line >= 1 && p.Position >= 1, p.Sentence));
        }
    }

    [Theory]
    [InlineData("[estimate]\nform = \"unscaled\"\nstarts = 1\nseed = -3\n", NestedLogitForm.Unscaled, 1, -3)]
    [InlineData("[estimate]\nform = \"utility-scaled\"\n", NestedLogitForm.UtilityScaled, 20, 7)]
    public void Estimation_settings_are_read(string text, NestedLogitForm form, int starts, long seed) =>
        Assert.Equal(new EstimateSettings(form, starts, seed), StudyText.Good(StudyText.Small + text).Estimate);

    [Theory]
    [InlineData("auto", JackknifeKind.Auto)]
    [InlineData("refit", JackknifeKind.Refit)]
    [InlineData("one_step", JackknifeKind.OneStep)]
    [InlineData("off", JackknifeKind.Off)]
    public void Every_kind_of_jackknife_is_read(string word, JackknifeKind kind) =>
        Assert.Equal(
            new InferenceSettings("household", 0.9, kind, 0, 11),
            StudyText.Good(
                StudyText.Small + $"[inference]\ncluster = \"household\"\nconfidence = 0.9\njackknife = \"{word}\"\n[inference.bootstrap]\nreplicates = 0\nseed = 11\n").Inference);

    [Theory]
    [InlineData("recorded", PreviousRule.Recorded)]
    [InlineData("step", PreviousRule.Step)]
    [InlineData("day", PreviousRule.Day)]
    [InlineData("workday", PreviousRule.Workday)]
    [InlineData("week", PreviousRule.Week)]
    public void Every_rule_of_history_is_read(string word, PreviousRule rule) =>
        Assert.Equal(rule, StudyText.Good(StudyText.Small + $"[history]\nprevious = \"{word}\"\n").History.Previous);

    [Fact]
    public void The_longest_gap_and_zero_for_missing_history_are_read()
    {
        var history = StudyText.Good(StudyText.Small + "[history]\nprevious = \"recorded\"\nlongest_gap = 10\nwithout_history = \"zero\"\n").History;
        Assert.Equal((10, MissingHistory.Zero), (history.LongestGap, history.WithoutHistory));
    }

    public static TheoryData<string, object> Sources => new()
    {
        { "column = \"x\"", new ColumnSource("x", new Now(), null, false, null) },
        { "column = \"x\"\nlag = 2", new ColumnSource("x", new Lag(2), null, false, null) },
        { "column = \"x\"\nlead = 3", new ColumnSource("x", new Lead(3), null, false, null) },
        { "column = \"x\"\nchange = 1", new ColumnSource("x", new Change(1), null, false, null) },
        { "column = \"x\"\nperson_mean = true", new ColumnSource("x", new PersonMean(), null, false, null) },
        { "column = \"x\"\nperson_mean = false", new ColumnSource("x", new Now(), null, false, null) },
        { "column = \"x\"\nchosen_then = 1", new ColumnSource("x", new ChosenThen(1), null, false, null) },
        { "column = \"x\"\nlevels = true\nomit = \"Mon\"\neach = true", new ColumnSource("x", new Now(), null, true, "Mon") },
        { "column = \"x\"\nis = \"Mon\"\nlag = 1", new ColumnSource("x", new Lag(1), "Mon", false, null) },
        { "constant = true\nalternatives = [\"tram\"]", new ConstantSource() },
        { "constant = true\ntimes = \"x\"", new ConstantSource() },
        { "last_choice = 2", new LastChoiceSource(2) },
        { "last_nest = 1", new LastNestSource(1) },
        { "stock = 0.7", new StockSource(0.7) },
        { "past_share = true", new PastShareSource() },
        { "first_choice = true", new FirstChoiceSource() },
    };

    [Theory]
    [MemberData(nameof(Sources))]
    public void Every_source_of_a_term_is_read(string text, object source)
    {
        var study = StudyText.Good(
            StudyText.Panel + "[history]\nprevious = \"step\"\n[[nest]]\nname = \"n\"\nmembers = [\"tram\"]\n[[term]]\nname = \"t\"\n" + text);
        Assert.Equal(source, study.Terms[0].Source);
    }

    [Fact]
    public void Everything_done_to_a_term_is_read()
    {
        var study = StudyText.Good(
            StudyText.Panel + "[[term]]\nname = \"t\"\ncolumn = \"x\"\ntransform = \"log\"\ntimes = \"income\"\nscale = -0.01\nfixed = 0\n"
            + "[[term]]\nname = \"u\"\ncolumn = \"y\"\nstart = 1\n");
        Assert.Equal((true, "income", -0.01, 0, null), (study.Terms[0].Log, study.Terms[0].Times, study.Terms[0].Scale, study.Terms[0].Fixed, study.Terms[0].Start));
        Assert.Equal((false, null, 1.0, null, 1.0), (study.Terms[1].Log, study.Terms[1].Times, study.Terms[1].Scale, study.Terms[1].Fixed, study.Terms[1].Start));
    }

    [Theory]
    [InlineData("stock = 0.5")]
    [InlineData("past_share = true")]
    [InlineData("first_choice = true")]
    [InlineData("column = \"x\"\nperson_mean = true")]
    public void What_needs_only_earlier_records_may_leave_out_the_previous_rule(string source) =>
        Assert.Null(StudyText.Good(StudyText.Panel + "[[term]]\nname = \"t\"\n" + source).History.Previous);

    [Fact]
    public void Other_ways_of_writing_the_same_toml_are_read_alike()
    {
        var study = StudyText.Good(
            """
            panel.file = 'a.parquet'
            panel.person = "p"
            "panel".alternative = "m"
            panel . chosen = "c"
            nest = [ { name = "n", members = ["tram", "bus"] } ]
            inference = { cluster = "household", bootstrap.replicates = 1_000 }
            [[term]]
            name = "time"
            column = "minutes"
            """);
        Assert.Equal(("a.parquet", "p", "m", "c"), (study.Panel.File, study.Panel.Person, study.Panel.Alternative, study.Panel.Chosen));
        Assert.Equal(["tram", "bus"], study.Nests[0].Members.AsEnumerable());
        Assert.Equal(("household", 1000), (study.Inference.Cluster, study.Inference.Replicates));
    }

    [Fact]
    public void The_bootstrap_table_may_stand_without_or_before_its_parent() =>
        Assert.Equal((5, 0.9), StudyText.Good(StudyText.Small + "[inference.bootstrap]\nreplicates = 5\n[inference]\nconfidence = 0.9\n").Inference is var i ? (i.Replicates, i.Confidence) : default);
}
