using System.Globalization;
using FsCheck;
using FsCheck.Fluent;
using FsCheck.Xunit;
using PanelChoice.Panels;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Panels;

public sealed class ChoicePanelTests : IDisposable
{
    private const string Small = """
        person,day,mode,chosen,on,time,w,house
        10,2,car,0,1,9,1.5,blue
        10,2,bus,1,1,8,1.5,blue
        9,1,tram,1,1,3,2,red
        9,1,bus,0,0,,2,red
        10,1,bus,0,1,6,1.5,blue
        10,1,car,1,1,7,1.5,blue
        2,5,car,1,1,1,0.5,blue

        """;

    private readonly TemporaryFolder folder = new();

    public void Dispose() => folder.Dispose();

    private ChoicePanel Panel(string text, Func<string, StudySpecification> study) => Tables.Panel(study(folder.Write("panel.csv", text)));

    [Fact]
    public void Persons_occasions_and_choice_sets_are_put_in_order()
    {
        var panel = Panel(Small, p => StudySketch.Over(p, StudySketch.Numbers("time"), offered: "on", weight: "w", cluster: "house"));
        Assert.Equal(["2", "9", "10"], panel.Persons.ToArray());
        Assert.Equal(["bus", "car", "tram"], panel.Alternatives.ToArray());
        Assert.Equal([0, 1, 2, 4], panel.PersonStart.ToArray());
        Assert.Equal([0, 1, 2, 2], panel.PersonOf.ToArray());
        Assert.Equal([5, 1, 1, 2], panel.Occasion.ToArray());
        Assert.Equal([-1, 6, -1, 3, -1, 2, 4, 5, -1, 1, 0, -1], panel.Row.ToArray());
        Assert.Equal([false, true, false, false, false, true, true, true, false, true, true, false], panel.Offered.ToArray());
        Assert.Equal([1, 2, 1, 0], panel.Chosen.ToArray());
        Assert.Equal([0.5, 2, 1.5], panel.Weight.ToArray());
        Assert.True(panel.IsWeighted);
        Assert.Equal("house", panel.ClusterBy);
        Assert.Equal(["blue", "red"], panel.Clusters.ToArray());
        Assert.Equal([0, 1, 0], panel.ClusterOf.ToArray());
        Assert.Equal([1, 1, 2, 2], Enumerable.Range(0, 4).Select(panel.OfferedAt));
    }

    [Fact]
    public void Without_weights_and_clusters_every_person_counts_once_and_stands_alone()
    {
        var panel = Panel(Small, p => StudySketch.Over(p, offered: "on"));
        Assert.False(panel.IsWeighted);
        Assert.Equal([1, 1, 1], panel.Weight.ToArray());
        Assert.Equal("person", panel.ClusterBy);
        Assert.Equal(panel.Persons, panel.Clusters);
        Assert.Equal([0, 1, 2], panel.ClusterOf.ToArray());
    }

    [Theory]
    [InlineData("10 9 2 -1 007 7", "-1 2 007 7 9 10")]
    [InlineData("10 9 2 a", "10 2 9 a")]
    [InlineData("b B a Z", "B Z a b")]
    [InlineData("123456789012345678901 3", "3 123456789012345678901")]
    [InlineData("10 9.5", "10 9.5")]
    public void Ids_are_in_order_of_number_only_when_all_are_whole_numbers(string ids, string order)
    {
        var rows = string.Concat(ids.Split(' ').Select(id => $"{id},1,bus,1\n"));
        Assert.Equal(order, string.Join(' ', Panel("person,day,mode,chosen\n" + rows, p => StudySketch.Over(p)).Persons));
    }

    [Fact]
    public void Empty_weights_and_clusters_where_the_alternative_was_not_offered_do_not_matter()
    {
        var text = "person,day,mode,chosen,on,w,house\n1,1,bus,0,0,,\n1,1,car,1,1,2.5,red\n1,1,tram,0,1,2.5,red\n";
        var panel = Panel(text, p => StudySketch.Over(p, offered: "on", weight: "w", cluster: "house"));
        Assert.Equal(2.5, Assert.Single(panel.Weight));
        Assert.Equal("red", panel.Clusters[Assert.Single(panel.ClusterOf)]);
    }

    [Fact]
    public void Without_an_occasion_column_each_person_has_one_occasion()
    {
        var panel = Panel("person,mode,chosen\n1,bus,1\n1,car,0\n2,bus,0\n2,car,1\n", p => StudySketch.Over(p, occasion: null));
        Assert.Equal([0, 1, 2], panel.PersonStart.ToArray());
        Assert.Equal([0, 1], panel.Chosen.ToArray());
    }

    [Fact]
    public void The_same_panel_from_csv_and_from_parquet()
    {
        var csv = folder.Write("panel.csv", Small);
        var parquet = new ParquetTable()
            .Add("person", 10L, 10, 9, 9, 10, 10, 2).Add("day", 2, 2, 1, 1, 1, 1, 5).AddText("mode", "car", "bus", "tram", "bus", "bus", "car", "car")
            .Add("chosen", false, true, true, false, false, true, true).Add<byte>("on", 1, 1, 1, 0, 1, 1, 1).AddNullable<double>("time", 9, 8, 3, null, 6, 7, 1)
            .Add("w", 1.5f, 1.5f, 2f, 2f, 1.5f, 1.5f, 0.5f).AddText("house", "blue", "blue", "red", "red", "blue", "blue", "blue")
            .WriteTo(folder.PathOf("panel.parquet"), rowsPerGroup: 3);
        StudySpecification Study(string path) => StudySketch.Over(path, StudySketch.Numbers("time"), offered: "on", weight: "w", cluster: "house");
        Tables.AssertSame(Tables.Read(Study(csv)), Tables.Read(Study(parquet)));
        Tables.AssertSame(Tables.Panel(Study(csv)), Tables.Panel(Study(parquet)));
    }

    [Property(MaxTest = 60)]
    public Property Shuffling_the_rows_changes_nothing_but_row_numbers() => Prop.ForAll(
        ArbMap.Default.ArbFor<int>(),
        seed =>
        {
            var random = new Random(seed);
            var rows = RandomRows(random).ToArray();
            StudySpecification Study(IEnumerable<string> lines) => StudySketch.Over(
                folder.Write("panel.csv", "person,day,mode,chosen,on,time,w,house\n" + string.Join('\n', lines)),
                StudySketch.Numbers("time"), offered: "on", weight: "w", cluster: "house");
            var straight = Tables.Panel(Study(rows));
            random.Shuffle(rows);
            var shuffled = Tables.Panel(Study(rows));
            Tables.AssertSame(straight, shuffled);
            for (var cell = 0; cell < shuffled.Row.Length; cell++)
                if (shuffled.Row[cell] is var row and >= 0)
                {
                    Assert.Equal(shuffled.Alternatives[cell % shuffled.Alternatives.Length], Tables.Names(shuffled.Table.Alternative)[row]);
                    Assert.Equal(row + 2, shuffled.Table.SourceRow[row]);
                }
        });

    private static IEnumerable<string> RandomRows(Random random)
    {
        string[] modes = ["tram", "bus", "car", "walk"];
        var alphabetic = random.Next(2) == 0;
        foreach (var person in Enumerable.Range(1, random.Next(1, 8)))
        {
            var weight = random.Next(1, 9) * 0.25;
            var house = random.Next(3);
            foreach (var day in Enumerable.Range(1, 12).Where(_ => random.Next(3) > 0).Prepend(0))
            {
                var chosen = random.Next(modes.Length);
                for (var j = 0; j < modes.Length; j++)
                {
                    var isOffered = j == chosen || random.Next(4) > 0;
                    if (!isOffered && random.Next(2) == 0) continue;
                    yield return string.Create(
                        CultureInfo.InvariantCulture,
                        $"{(alphabetic ? "P" : "")}{person * 7 % 11},{day},{modes[j]},{(j == chosen ? 1 : 0)},{(isOffered ? 1 : 0)},{(isOffered ? random.Next(50) : "")},{weight},h{house}");
                }
            }
        }
    }
}
