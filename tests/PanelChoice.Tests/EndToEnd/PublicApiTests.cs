using PublicApiGenerator;
using Xunit;

namespace PanelChoice.Tests.EndToEnd;

/// <summary>The library's public face, as approved: nothing becomes public, changes or goes by accident.</summary>
public class PublicApiTests
{
    [Fact]
    public void The_public_api_is_as_approved() =>
        Approval.Check("public-api.txt", typeof(PanelAnalysis).Assembly.GeneratePublicApi(new ApiGeneratorOptions { IncludeAssemblyAttributes = false }) + "\n");
}
